#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A step that must reach its film and does not: status 4, the reason in words, and valid output.
# Without `must_end` the same run is a result (status 0, not cleared). The seed is in the resolved
# case, so that running that file again gives the same profile.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
sed -e 's/no_longer_than: 150 s/no_longer_than: 2 s, must_end: true/' -e 's/spacing: 2 nm/spacing: 5 nm/' \
    "$root/examples/poly-trench/case.yaml" >"$work/must.yaml"
sed -e 's/, must_end: true//' "$work/must.yaml" >"$work/may.yaml"

"$rille" run "$work/must.yaml" -o "$work/must" --quiet 2>"$work/errors"
status=$?
[ $status = 4 ] || { echo "FAILED: status $status, wanted 4"; exit 1; }
grep -q 'step main: did not reach stop at trench centre within 2 s' "$work/errors" || { cat "$work/errors"; exit 1; }
grep -q '"status": "failed"' "$work/must/run.json" || { echo "FAILED: run.json"; exit 1; }
[ -s "$work/must/profile.svg" ] && [ -s "$work/must/metrics.json" ] && ls "$work"/must/frames/*.vtp >/dev/null || { echo "FAILED: output"; exit 1; }

"$rille" run "$work/may.yaml" -o "$work/may" --quiet --seed 7 || { echo "FAILED: status $?"; exit 1; }
grep -q '"status": "not cleared"' "$work/may/run.json" || { echo "FAILED: not cleared"; exit 1; }
"$rille" run "$work/may/case.yaml" -o "$work/again" --quiet || { echo "FAILED: resolved case"; exit 1; }
cmp "$work/may/profile.csv" "$work/again/profile.csv"
