#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A run that is told to stop leaves valid output and says so: status 130 after Ctrl-C, 143 after
# SIGTERM. A second signal ends it at once; after that, and after SIGKILL, what lies there is whole.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

start() { # start NAME: begins a run that takes long enough and waits for its first frame
    "$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=4 nm' -o "$work/$1" \
        2>"$work/$1.log" >"$work/$1.txt" &
    pid=$!
    for _ in $(seq 200); do
        ls "$work/$1"/frames/*.vtp >/dev/null 2>&1 && return
        sleep 0.1
    done
    echo "FAILED: no first frame"
    exit 1
}
ends_with() { # ends_with STATUS
    wait $pid
    local status=$?
    [ $status = "$1" ] || { echo "FAILED: status $status, wanted $1"; exit 1; }
}

for signal in INT:130 TERM:143; do
    start "${signal%:*}"
    sleep 0.5
    kill -"${signal%:*}" $pid
    ends_with "${signal#*:}"
    out=$work/${signal%:*}
    python3 - "$out" <<'P' || exit 1
import json, sys, xml.dom.minidom
out = sys.argv[1]
record = json.load(open(out + "/run.json"))
assert record["status"] == "interrupted", record["status"]
metrics = json.load(open(out + "/metrics.json"))
assert metrics["final"] is False
assert all(t["verdict"] == "undecided" and "has not come to its end" in t["reason"] for t in metrics["targets"])
xml.dom.minidom.parse(out + "/profile.svg")
xml.dom.minidom.parse(out + "/front.pvd")
assert len(open(out + "/history.csv").read().splitlines()) >= 2
P
    grep -q 'stopping' "$out.log" || { echo "FAILED: not said"; exit 1; }
    "$rille" measure "$out" | grep -q 'nm' || { echo "FAILED: measure"; exit 1; }
    "$rille" measure "$out" --json | cmp - "$out/metrics.json" || { echo "FAILED: measured again"; exit 1; }
    grep -q "^rille resume $out takes it up" "$work/${signal%:*}.txt" || { echo "FAILED: no way on is told"; exit 1; }
    cp "$out/report.html" "$work/before.html"
    "$rille" report "$out" --quiet
    for page in "$work/before.html" "$out/report.html"; do
        for words in 'Interrupted</strong> before the end' "rille resume $out<" 'stopped before its end' \
            'Run, not at its end' 'Where it stands'; do
            grep -q "$words" "$page" || { echo "FAILED: the report does not say: $words"; exit 1; }
        done
    done
done

whole() { # every file under its final name can be read, and the case can be run again
    python3 - "$1" <<'P' || exit 1
import glob, sys, xml.dom.minidom
out = sys.argv[1]
frames = glob.glob(out + "/frames/*.vtp")
assert frames
for file in frames + glob.glob(out + "/*.pvd") + glob.glob(out + "/*.svg"):
    xml.dom.minidom.parse(file)
P
    "$rille" measure "$1" >/dev/null || { echo "FAILED: measure after a kill"; exit 1; }
}
start twice
kill -TERM $pid
sleep 0.05
kill -INT $pid
ends_with 130
whole "$work/twice"
[ ! -e "$work/twice/metrics.json" ] || { echo "FAILED: the second signal came too late to show anything"; exit 1; }

start killed
sleep 0.5
kill -KILL $pid
ends_with 137 2>/dev/null # the shell's own word about it
whole "$work/killed"
"$rille" run "$work/killed/case.yaml" --set 'recipe.steps.main.no_longer_than=1 s' -o "$work/killed" \
    --force --quiet || { echo "FAILED: run again"; exit 1; }
! ls -A "$work/killed" "$work/killed/frames" | grep '\.part$' || { echo "FAILED: left behind"; exit 1; }
