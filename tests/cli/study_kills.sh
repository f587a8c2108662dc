#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# kill -9 of a worker or of the whole study at random moments: what follows completes it, with the
# same bits as an undisturbed one, and no point is lost or half written.
#   study_kills.sh RILLE [KILLS] [SEED]
set -uo pipefail
rille=$1
kills=${2:-6}
RANDOM=${3:-1}
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
. "$root/tests/support/study.sh"
study_of "$work/in" 'slurm: {retries: {killed: 100}}'
cd "$work" || exit 1

begin=$(date +%s%N)
"$rille" study in/study.yaml -o whole --workers 2 --quiet || fail "undisturbed: status $?"
took=$((($(date +%s%N) - begin) / 1000000)) # ms

killed_workers=0 killed_studies=0 runs=0
finish() { # the study that was disturbed comes to its end like the other one
    "$rille" study in/study.yaml -o "$work/out" --workers 2 --quiet 2>/dev/null || fail "taken up: status $?"
    # A worker whose parent was killed ends after a refresh at most; then nothing of it is left.
    for _ in $(seq 100); do pgrep -f "study-worker $work/out" >/dev/null || break; sleep 0.1; done
    "$rille" study in/study.yaml -o out --quiet || fail "complete: status $?"
    same_results whole out || fail "after $killed_workers workers and $killed_studies studies"
    for point in out/points/*; do
        python3 -c 'import json,sys; json.load(open(sys.argv[1]))' "$point/point.json" || fail "$point"
    done
    rm -rf out
    runs=$((runs + 1))
}
while [ $((killed_workers + killed_studies)) -lt "$kills" ]; do
    "$rille" study in/study.yaml -o "$work/out" --workers 2 --quiet 2>/dev/null &
    pid=$!
    sleep "$(awk -v t=$((RANDOM % took)) 'BEGIN { print t / 1000 }')"
    mapfile -t workers < <(pgrep -P $pid)
    if [ $((RANDOM % 2)) = 0 ] && [ ${#workers[@]} -gt 0 ]; then
        kill -9 "${workers[RANDOM % ${#workers[@]}]}" 2>/dev/null &&
            killed_workers=$((killed_workers + 1))
        wait $pid || fail "the study has not survived its worker: status $?"
    else
        kill -9 $pid 2>/dev/null && killed_studies=$((killed_studies + 1))
        wait $pid
    fi 2>/dev/null
    done=$(find out/points -maxdepth 1 -name '[0-9]*' 2>/dev/null | wc -l)
    [ "$done" -lt 6 ] || finish
done
finish
echo "$killed_workers workers and $killed_studies studies killed, $runs studies completed"
