#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# An interrupted run says so by status 130 and leaves valid output.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

"$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=4 nm' -o "$work/out" --quiet &
pid=$!
for _ in $(seq 200); do # until the first frame lies there
    ls "$work"/out/frames/*.vtp >/dev/null 2>&1 && break
    sleep 0.1
done
sleep 1
kill -INT $pid
wait $pid
status=$?
[ $status = 130 ] || { echo "FAILED: status $status, wanted 130"; exit 1; }
python3 - "$work/out" <<'P' || exit 1
import json, sys, xml.dom.minidom
out = sys.argv[1]
record = json.load(open(out + "/run.json"))
assert record["status"] == "interrupted", record["status"]
json.load(open(out + "/metrics.json"))
xml.dom.minidom.parse(out + "/profile.svg")
xml.dom.minidom.parse(out + "/front.pvd")
assert len(open(out + "/history.csv").read().splitlines()) >= 2
P
"$rille" measure "$work/out" | grep -q 'nm' || { echo "FAILED: measure"; exit 1; }
