#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A run that was stopped by a signal, or killed, is taken up and ends with the same bits as one that
# was not, on another number of threads.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

options=(--set 'spacing=5 nm' --set 'recipe.steps.main.no_longer_than=14 s'
    --set 'sampling.ions_per_species=4096' --quiet)
fail() { echo "FAILED: $*"; exit 1; }

"$rille" run "$root/examples/poly-trench/case.yaml" "${options[@]}" -o "$work/whole" --threads 1 || fail "run"
[ ! -e "$work/whole/state.bin" ] || fail "a state is left although the run has ended"
"$rille" resume "$work/whole" --quiet 2>"$work/errors" && fail "an ended run was taken up"
grep -q 'no saved state' "$work/errors" || fail "$(cat "$work/errors")"

for signal in INT:130 KILL:137; do
    out=$work/${signal%:*}
    "$rille" run "$root/examples/poly-trench/case.yaml" "${options[@]}" -o "$out" --threads 1 2>/dev/null &
    pid=$!
    for _ in $(seq 400); do # until the third frame
        [ -e "$out/frames/frame_0002.vtp" ] && [ -e "$out/state.bin" ] && break
        sleep 0.05
    done
    kill -"${signal%:*}" $pid
    wait $pid 2>/dev/null
    status=$?
    [ $status = "${signal#*:}" ] || fail "status $status, wanted ${signal#*:}"
    [ -e "$out/state.bin" ] || fail "no state"
    "$rille" resume "$out" --threads 2 --quiet || fail "resume: status $?"
    for file in case.yaml profile.csv history.csv metrics.json front.pvd profile.svg; do
        cmp "$work/whole/$file" "$out/$file" || fail "$file after $signal"
    done
    (cd "$work/whole" && sha256sum frames/*) >"$work/frames"
    (cd "$out" && sha256sum --quiet -c "$work/frames" && [ "$(ls frames)" = "$(ls "$work/whole/frames")" ]) ||
        fail "frames after $signal"
    grep -q '"resumed": 1' "$out/run.json" || fail "run.json does not say so"
    [ ! -e "$out/state.bin" ] || fail "a state is left"
done 2>&1 | grep -v 'Killed' ; [ "${PIPESTATUS[0]}" = 0 ] || exit 1

# A case that was changed after the stop is not taken up.
"$rille" run "$root/examples/poly-trench/case.yaml" "${options[@]}" -o "$work/changed" 2>/dev/null &
pid=$!
for _ in $(seq 400); do [ -e "$work/changed/state.bin" ] && break; sleep 0.05; done
kill -TERM $pid
wait $pid
sed -i 's/^  seed: 1/  seed: 2/' "$work/changed/case.yaml"
"$rille" resume "$work/changed" --quiet 2>"$work/errors"
[ $? = 5 ] && grep -q 'was changed' "$work/errors" || fail "a changed case: $(cat "$work/errors")"
"$rille" resume "$work/nowhere" 2>"$work/errors"
[ $? = 5 ] && grep -q 'nowhere' "$work/errors" || fail "no folder: $(cat "$work/errors")"
