#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# rille sheath: the table, the files, what is kept between calls, and a table that a case imports.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
export XDG_CACHE_HOME=$work/cache
case=$root/examples/poly-trench/case.yaml
fail() { echo "FAILED: $1"; exit 1; }

"$rille" sheath "$case" -o "$work/out" >"$work/table" || fail "status $?"
for word in 'Debye lengths' 'closed form' 'Cl2+' 'not permitted settings' 'not used by the model: source_power'; do
    grep -qF -- "$word" "$work/table" || fail "the table lacks '$word'"
done
for file in sheath.svg sheath.png sheath.csv distributions/main_Cl2+.csv distributions/main_Ar+.csv; do
    [ -s "$work/out/$file" ] || fail "$file is missing"
done
head -n 1 "$work/out/sheath.csv" | grep -q 'flux_per_nm2_s,mean_energy_eV' || fail "no units in the header"
"$rille" sheath "$case" --json | python3 -c '
import json, sys
particles = json.load(sys.stdin)["plasmas"][0]["particles"]
assert [p["particle"] for p in particles] == ["Cl2+", "fast Cl2", "Ar+", "fast Ar"], particles
assert all(p["energy_5_percent_eV"] < p["mean_energy_eV"] < p["energy_95_percent_eV"] for p in particles)
' || fail "the JSON"
[ ! -e "$work/cache/rille" ] || fail "a closed form needs no cache"

# With collisions: computed once, the same again from the cache, the same without it.
deep=(--set 'plasmas.main.pressure=60 mTorr' --set 'plasmas.main.sheath.trajectories=20000')
"$rille" sheath "$case" "${deep[@]}" >"$work/first" || fail "status $?"
grep -q 'fast Ar' "$work/first" || fail "no fast neutrals"
ls "$work/cache/rille"/*.bin >/dev/null || fail "nothing was kept"
"$rille" sheath "$case" "${deep[@]}" --threads 1 >"$work/second"
cmp -s "$work/first" "$work/second" || fail "the kept result differs"
XDG_CACHE_HOME=$work/other "$rille" sheath "$case" "${deep[@]}" --threads 2 >"$work/third"
cmp -s "$work/first" "$work/third" || fail "the result depends on threads"

# What was written can be imported.
sed "s|rf_bias: .*|ion_energies: {Cl2+: {file: '$work/out/distributions/main_Cl2+.csv'}, Ar+: {file: '$work/out/distributions/main_Ar+.csv'}}|" \
    "$case" >"$work/case.yaml"
"$rille" sheath "$work/case.yaml" >"$work/imported" || fail "the written tables are not read"
grep -q ' table$' "$work/imported" || fail "the tables are not used"
