#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# rille flux: its files, its JSON, a contour to start from, arrivals along the surface during a run.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
case=$root/examples/poly-trench/case.yaml
small=(--set 'spacing=4 nm' --set 'sampling.ions_per_species=2048')
fail() { echo "FAILED: $1"; exit 1; }

"$rille" flux "$case" "${small[@]}" -o "$work/fresh" --json --quiet >"$work/said.json" || fail "status $?"
for file in flux.csv flux.json flux.svg flux.png; do
    [ -s "$work/fresh/$file" ] || fail "$file is missing"
done
cmp -s "$work/said.json" "$work/fresh/flux.json" || fail "what is printed is not what is written"
"$rille" flux "$case" "${small[@]}" -o "$work/again" --threads 1 --quiet || fail "status $?"
cmp -s "$work/fresh/flux.csv" "$work/again/flux.csv" || fail "the result depends on threads"
"$rille" flux "$case" -o "$work/fresh" --quiet 2>"$work/error" && fail "a folder in use was taken"
"$rille" flux "$case" --plasma mian -o "$work/no" --quiet 2>"$work/error"
[ $? -eq 3 ] && grep -q 'did you mean "main"' "$work/error" || fail "an unknown plasma: $(cat "$work/error")"

# A run writes the same columns at its times, and leaves a profile that another can start from.
"$rille" run "$case" "${small[@]}" --set 'recipe.steps.main.no_longer_than=6 s' --set 'recipe.steps.over.time=1 s' \
    --set 'arc_data.at=[0 s, 2 s, 4.5 s]' -o "$work/run" --quiet || fail "the run: status $?"
for time in 0 2 4.5; do
    [ -s "$work/run/arc_data/${time}s.csv" ] || fail "no arrivals at $time s"
done
"$rille" flux "$case" "${small[@]}" --set "start={contour: '$work/run/profile.csv'}" -o "$work/etched" --quiet ||
    fail "a saved profile: status $?"
# The same round via as a body of revolution and in full.
via=$root/examples/contact-via/case.yaml
"$rille" flux "$via" --set 'spacing=3 nm' -o "$work/full" --quiet || fail "a via in full: status $?"
"$rille" flux "$via" --set 'spacing=3 nm' --set symmetry=revolved --set 'pitch=96 nm' -o "$work/revolved" --quiet ||
    fail "a revolved via: status $?"
python3 - "$work" <<'P' || exit 1
import csv, json, sys
work = sys.argv[1]

def rows(path):
    return list(csv.DictReader(line for line in open(path) if not line.startswith("#")))

def check(holds, what):
    if not holds:
        sys.exit("FAILED: " + what)

for name in ("fresh", "etched", "full", "revolved"):
    table = rows(work + "/" + name + "/flux.csv")
    causes = [c for c in table[0] if c.startswith("rate_by_") and "_error_" not in c]
    check(len(causes) == 12, "causes: %s" % causes)
    for row in table:
        rate = float(row["rate_nm_per_min"])
        total = sum(float(row[c]) for c in causes)
        check(abs(total - rate) <= 1e-9 * max(1, abs(rate)), "%s: causes %r of rate %r" % (name, total, rate))
        check(float(row["rate_error_nm_per_min"]) >= 0, "an error")
    record = json.load(open(work + "/" + name + "/flux.json"))
    check(record["health"]["lost_rays"] == 0 and record["health"]["surface_elements"] == len(table), record["health"])
    check("verify on wafers" in record["caution"], "caution")
    check(sum(record["parameter_standing"].values()) > 5, record["parameter_standing"])
begun = rows(work + "/run/arc_data/0s.csv")
for one, other in zip(rows(work + "/fresh/flux.csv"), begun):
    a, b = float(one["rate_nm_per_min"]), float(other["rate_nm_per_min"])
    check(abs(a - b) <= 1e-5 * abs(a), "the start of a run is not the fresh surface: %r, %r" % (a, b))
flat = [r for r in rows(work + "/fresh/flux.csv") if r["region"] == "top"]
energy = [float(r["ion_Ar+_direct_mean_energy_eV"]) for r in flat]
check(all(abs(e - energy[0]) < 1e-3 * energy[0] for e in energy), "energies on the open mask: %s" % energy)
check(50 < energy[0] < 300, "energy %s" % energy[0])
floor = lambda name: sum(float(r["z_nm"]) for r in rows(work + "/" + name + "/flux.csv") if r["region"] == "floor") / \
    sum(r["region"] == "floor" for r in rows(work + "/" + name + "/flux.csv"))
check(floor("etched") < floor("fresh") - 10, "the etched floor lies deeper")

# Over the floor the exact exchange of rings agrees with that of rays, and so do ions: within the
# stated errors of both and what the coarse contour of the mask (19 cells across) does, 1 % for
# direct ions and 2 % for what has met walls.
def over_floor(name, column):
    table = [r for r in rows(work + "/" + name + "/flux.csv") if r["region"] == "floor" and r["film"] == "oxide"]
    area = [float(r["area_nm2"]) for r in table]
    return sum(a * float(r[column]) for a, r in zip(area, table)) / sum(area)

for quantity, unit, near in (("neutral_F", "per_nm2_s", 0.02), ("ion_Ar+_direct", "per_nm2_s", 0.01),
                             ("fast_neutral_of_Ar+", "per_nm2_s", 0.02), ("rate", "nm_per_min", 0.02)):
    a, b = (over_floor(name, quantity + "_" + unit) for name in ("full", "revolved"))
    errors = [over_floor(name, quantity + "_error_" + unit) for name in ("full", "revolved")]
    bar = (errors[0] ** 2 + errors[1] ** 2) ** 0.5
    check(bar < 0.06 * b, "%s: errors %r say nothing" % (quantity, errors))
    check(abs(a - b) < near * b + bar, "%s: full %r, revolved %r, errors %r" % (quantity, a, b, errors))
P
