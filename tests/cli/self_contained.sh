#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The folder of a run holds all that it needs: moved away, with the files that the case named gone,
# its case gives the same bits.
set -euo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

mkdir "$work/here"
cp "$root/configs/chemistries/silicon-cl2-ar.yaml" "$work/here/own.yaml"
cat >"$work/here/ions.csv" <<'T'
# quantity=flux_fraction_per_bin
# energy_reference=wafer
# source=invented
E_lo_eV,E_hi_eV,weight
60,100,0.4
100,140,0.6
T
sed -e 's/rf_bias: {frequency: 13.56 MHz, amplitude: 115 V}/ion_energies: {file: ions.csv}/' \
    -e 's/chemistry: silicon-cl2-ar/chemistry: own.yaml/' -e 's/spacing: 2 nm/spacing: 8 nm/' \
    -e 's/no_longer_than: 150 s/no_longer_than: 2 s/' "$root/examples/poly-trench/case.yaml" \
    >"$work/here/case.yaml"
echo 'sampling: {ions_per_species: 1024}' >>"$work/here/case.yaml"
(cd "$work/here" && "$rille" run case.yaml -o ../out --quiet)
mv "$work/out" "$work/moved"
rm -r "$work/here"
"$rille" run "$work/moved/case.yaml" -o "$work/again" --quiet
for file in case.yaml inputs/own.yaml inputs/ions.csv profile.csv history.csv metrics.json; do
    cmp "$work/moved/$file" "$work/again/$file"
done
"$rille" measure "$work/moved" --json | cmp - "$work/moved/metrics.json"
# The copies are what is read: another table gives another profile.
sed -i 's/60,100,0.4/60,100,0.1/; s/100,140,0.6/100,140,0.9/' "$work/again/inputs/ions.csv"
"$rille" run "$work/again/case.yaml" -o "$work/other" --quiet
if cmp -s "$work/again/profile.csv" "$work/other/profile.csv"; then
    echo "the table beside the case is not read"
    exit 1
fi
