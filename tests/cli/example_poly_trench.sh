#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The trench example on a coarse grid: it runs to its end, its files are whole, and the profile is one
# that a process engineer would believe (ranges: common practice, no source).
set -euo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

"$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=5 nm' -o "$work/out" --quiet
python3 - "$work/out" <<'P'
import csv, json, sys, xml.dom.minidom
out = sys.argv[1]
record = json.load(open(out + "/run.json"))
assert record["status"] == "done", record["status"]
assert record["numerics"]["lost_share"] < 1e-5, record["numerics"]
assert any("charging" in warning for warning in record["warnings"])
metrics = {m["name"]: m for m in json.load(open(out + "/metrics.json"))["metrics"]}
def between(name, low, high):
    value = metrics[name]["value"]
    assert low <= value <= high, (name, value)
between("depth centre", 240, 252)        # through the silicon, in the oxide
between("top cd", 57, 68)
between("bottom cd", 42, 66)
between("sidewall angle left", 86, 91)   # steep
between("mask left", 40, 120)
between("selectivity", 2, 5)             # silicon to resist in chlorine
left, right = (metrics["sidewall angle " + side]["value"] for side in ("left", "right"))
assert abs(left - right) < 0.6, (left, right)   # the case is symmetric
for svg in ("profile.svg",):
    xml.dom.minidom.parse(out + "/" + svg)
with open(out + "/profile.png", "rb") as png:
    assert png.read(8) == b"\x89PNG\r\n\x1a\n"
times = [float(row[0]) for row in list(csv.reader(open(out + "/history.csv")))[1:]]
assert times == sorted(times) and times[-1] > 40
P
"$rille" check "$root/examples/poly-trench/case.yaml" --set 'spacing=5 nm' --json >"$work/estimate.json"
python3 "$root/tests/support/compare_estimate.py" "$work/estimate.json" "$work/out/run.json"
# Measuring again gives the same numbers; another height can be asked for.
"$rille" measure "$work/out" --json >"$work/again.json"
cmp "$work/again.json" "$work/out/metrics.json"
"$rille" measure "$work/out" --set 'measure.cd.middle=60 nm below gate top' | grep -q 'middle cd'
# The fault: a plasma without ions does not reach the stop, and the record says so.
"$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=5 nm' --set 'plasmas.main.ion_flux=0.001 mA/cm2' \
    --set 'recipe.steps.main.no_longer_than=2 s' -o "$work/dark" --quiet
grep -q '"status": "not cleared"' "$work/dark/run.json"
