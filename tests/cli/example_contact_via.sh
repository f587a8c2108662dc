#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The contact example at reduced size runs to its end and gives sensible results.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

# contact-via: the oxide thinned, so that a coarse run takes seconds.
reduced=(--set 'spacing=8 nm' --set 'mask.thickness=64 nm' --set 'stack.oxide.thickness=64 nm'
    --set 'sampling={rays_per_point: 32, ions_per_species: 8192}'
    --set 'plasmas.main.source_power=1500 W')
"$rille" run "$root/examples/contact-via/case.yaml" "${reduced[@]}" -o "$work/via" --quiet ||
    { echo "FAILED: contact-via stops with status $?"; exit 1; }
"$rille" check "$root/examples/contact-via/case.yaml" "${reduced[@]}" --json >"$work/estimate.json" || exit 1
python3 "$root/tests/support/compare_estimate.py" "$work/estimate.json" "$work/via/run.json" || exit 1
python3 - "$work/via" <<'P' || exit 1
import json, sys
out = sys.argv[1]
record = json.load(open(out + "/run.json"))
metrics = json.load(open(out + "/metrics.json"))
value = {m["name"]: m["value"] for m in metrics["metrics"]}

def check(holds, what):
    if not holds:
        sys.exit("FAILED: contact-via: " + what)

check(record["status"] in ("done", "not cleared"), record["status"])
numerics = record["numerics"]
check(numerics["lost_rays"] <= 1e-6 * numerics["rays"], "lost rays: %s" % numerics["lost_rays"])
check(record["steps"][0]["ended_by"].startswith("reached"), record["steps"][0]["ended_by"])
unused = record["not_used"]
check(len(unused["tool_log"]) == 3 and "helium: 15 Torr" in unused["tool_log"], "tool_log %s" % unused)
check(unused["plasmas"]["main"] == ["source_power: 1500 W"], unused)
check(60 < value["depth centre"] < 90, "depth %s" % value["depth centre"])
check(50 < value["top cd"] < 72, "top CD %s" % value["top cd"])
check(abs(value["top cd"] - value["top cd y"]) < 2, "CD x %s, CD y %s, a quarter of a cell apart"
      % (value["top cd"], value["top cd y"]))
check(40 < value["mask left"] < 64, "mask left %s" % value["mask left"])
P

# The same contact in r and z, finer.
"$rille" run "$root/examples/contact-via/case.yaml" "${reduced[@]}" --set symmetry=revolved --set 'pitch=96 nm' \
    --set 'spacing=4 nm' -o "$work/round" --quiet ||
    { echo "FAILED: the revolved contact stops with status $?"; exit 1; }
python3 - "$work/via" "$work/round" <<'P' || exit 1
import json, sys
def values(out):
    return {m["name"]: m["value"] for m in json.load(open(out + "/metrics.json"))["metrics"]}
full, revolved = values(sys.argv[1]), values(sys.argv[2])
record = json.load(open(sys.argv[2] + "/run.json"))
if record["numerics"]["lost_rays"] != 0:
    sys.exit("FAILED: revolved: lost rays: %s" % record["numerics"]["lost_rays"])
for name, apart in (("depth centre", 8), ("top cd", 6)):
    if abs(full[name] - revolved[name]) > apart:
        sys.exit("FAILED: %s: full %s, revolved %s" % (name, full[name], revolved[name]))
P
