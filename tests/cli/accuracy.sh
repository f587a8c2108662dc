#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A run that is asked for an accuracy finds its grid, says what it reached, goes on after a stop
# among the other grids to the same bits, and runs again from the case that it leaves.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
fail() { echo "FAILED: $*"; exit 1; }

sed 's/^spacing: 2 nm/accuracy: {cd: 3 nm}/' "$root/examples/poly-trench/case.yaml" >"$work/case.yaml"
grep -q '^accuracy' "$work/case.yaml" || fail "the example has another spacing"
options=(--set 'recipe.steps.main.no_longer_than=5 s' --set 'sampling.ions_per_species=2048' --quiet)

"$rille" run "$work/case.yaml" "${options[@]}" -o "$work/whole" || fail "run: status $?"
/usr/bin/python3 - "$work/whole" <<'END' || fail "errors"
import json, math, sys
folder = sys.argv[1]
metrics = json.load(open(folder + '/metrics.json'))['metrics']
cds = [m for m in metrics if m['name'].endswith(' cd') and m['value'] is not None]
assert cds
for m in cds:
    assert m['grid_error'] > 0, m
    assert math.hypot(m['grid_error'], m['sampling_error']) <= 3, m
runs = json.load(open(folder + '/grids.json'))['runs']
assert sum(r['is_main'] for r in runs) >= 1 and len(runs) >= 5, runs
assert 'met' in json.load(open(folder + '/run.json'))['accuracy']
END
grep -q '^accuracy:' "$work/whole/case.yaml" || fail "the case lost its accuracy"

# Stopped among the companions.
"$rille" run "$work/case.yaml" "${options[@]}" -o "$work/stopped" 2>/dev/null &
pid=$!
for _ in $(seq 2000); do
    [ -e "$work/stopped/grids.json" ] && break
    sleep 0.02
done
kill -INT $pid
wait $pid
[ $? = 130 ] || fail "an interrupted search: status $?"
"$rille" resume "$work/stopped" --quiet || fail "resume: status $?"
"$rille" run "$work/whole/case.yaml" --quiet -o "$work/again" || fail "again: status $?"
for other in stopped again; do
    for file in metrics.json profile.csv history.csv case.yaml; do
        cmp "$work/whole/$file" "$work/$other/$file" || fail "$file of $other"
    done
done
! "$rille" resume "$work/whole" --quiet 2>/dev/null || fail "an ended search was taken up"
