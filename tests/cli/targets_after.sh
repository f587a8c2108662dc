#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A target that holds at the end of a step: judged by the shape as it stood there, in a run, in one
# that was killed and taken up, measured again from the frames, and in a study.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
. "$root/tests/support/study.sh"
cd "$work" || exit 1
study_of in
sed -i 's/spacing: 8/spacing: 4/; /name: main, plasma/d' in/case.yaml
sed -i 's/^  steps:/  steps:\n    - {name: first, plasma: main, time: 2 s}\n    - {name: second, plasma: main, time: 3 s}/' in/case.yaml
cat >>in/case.yaml <<'T'
frames: {every: 0.6 s}
targets:
  depth centre: {at_most: 12 nm, after: first}
  mask left: {at_least: 1 nm, at_most: 100 nm, after: second}
  bow: at most 9 nm
T
options=(--set 'sampling.ions_per_species=8192' --set 'sampling.rays_per_point=64' --quiet)

"$rille" run in/case.yaml -o whole "${options[@]}" || fail "run: status $?"
# The same recipe without its second step ends where the first step of the other ends.
"$rille" run in/case.yaml -o first \
    --set 'recipe={wafer_temperature: 50 degC, steps: [{name: first, plasma: main, time: 2 s}]}' \
    --set 'targets={depth centre: at most 12 nm}' "${options[@]}" || fail "short run: status $?"
python3 - <<'P' || exit 1
import json
whole, first = (json.load(open(f + "/metrics.json")) for f in ("whole", "first"))
of = lambda run, name: next(t for t in run["targets"] if t["metric"] == name)
after, alone = of(whole, "depth centre"), of(first, "depth centre")
assert after["after"] == "first" and after["target"] == "depth centre after first: at most 12 nm", after
assert abs(after["value"] - alone["value"]) < 1e-6, (after, alone)
assert after["by_numbers"] == alone["by_numbers"] == "met", after
end = next(m for m in whole["metrics"] if m["name"] == "depth centre")
assert end["value"] > 1.5 * after["value"], (end, after)  # judged at the end it would be missed
assert end["value"] > 12
last = of(whole, "mask left")  # the end of the last step is the end of the run
assert last["value"] == next(m for m in whole["metrics"] if m["name"] == "mask left")["value"]
assert [s["step"] for s in whole["after_steps"]] == ["first", "second"]
assert whole["after_steps"][0]["time_s"] == 2
P
"$rille" measure whole --json | cmp - whole/metrics.json || fail "measured again"
"$rille" measure whole --set 'targets={bow: {at_most: 9 nm, after: fist}}' 2>errors
[ $? = 3 ] && grep -q 'no step of the recipe is called "fist".*did you mean "first"' errors || fail "$(cat errors)"
grep -q 'depth centre after first' whole/report.html || fail "the report does not say which step"

# Killed in the second step: what was measured at the end of the first is not lost.
"$rille" run in/case.yaml -o killed "${options[@]}" --set 'spacing=1 nm' 2>/dev/null &
pid=$!
for _ in $(seq 1000); do [ -e killed/state.bin ] && [ -e killed/frames/frame_0006.vtp ] && break; sleep 0.02; done
kill -KILL $pid
wait $pid 2>/dev/null
[ -e killed/state.bin ] || fail "the kill came too late"
"$rille" resume killed --quiet || fail "resume: status $?"
"$rille" run in/case.yaml -o unbroken "${options[@]}" --set 'spacing=1 nm' || fail "run"
cmp unbroken/metrics.json killed/metrics.json || fail "taken up: other values"
[ "$(ls unbroken/frames)" = "$(ls killed/frames)" ] || fail "other frames"

# A run that is stopped in its first step leaves these targets undecided.
"$rille" run in/case.yaml -o stopped "${options[@]}" --set 'spacing=1 nm' 2>/dev/null &
pid=$!
for _ in $(seq 1000); do [ -e stopped/frames/frame_0001.vtp ] && break; sleep 0.02; done
kill -INT $pid
wait $pid
[ $? = 130 ] || fail "stopped"
grep -q 'nothing is known of the end of step second' stopped/metrics.json || fail "$(grep -A9 targets stopped/metrics.json)"

"$rille" study in/study.yaml -o study --quiet || fail "study: status $?"
grep -v '^#' study/results.csv | head -1 >columns
for name in depth_centre_after_first_nm target_depth_centre_after_first target_mask_left_after_second target_bow; do
    grep -q ",$name," columns || fail "no column $name in $(cat columns)"
done
exit 0
