#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A study on a Slurm cluster (two virtual nodes on this machine): submitted, one task killed, taken
# up by itself, collected: the same bits as on this machine. Points that failed in numerics are not
# tried again; lost ones are, alone; cancelled ones wait for a person.
#   study_slurm.sh RILLE          a minute or two
#   study_slurm.sh RILLE limit    points that take longer than their job may: some six minutes, since
#                                 Slurm counts in minutes
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d "$PWD/slurm.XXXX")
chmod 755 "$work" # daemons and users of the cluster go through it
trap 'bash "$root/tests/support/slurm_stop.sh" "$work/cluster"; rm -rf "$work"' EXIT
. "$root/tests/support/study.sh"
PATH=$PATH:/usr/sbin
bash "$root/tests/support/slurm_start.sh" "$work/cluster"
case $? in 0) ;; 77) exit 77 ;; *) fail "the cluster does not start" ;; esac
export SLURM_CONF=$work/cluster/slurm.conf

# Users of clusters are not root: submit as somebody else where that can be done.
as_user=()
if [ "$(id -u)" = 0 ] && setpriv --reuid 65534 --regid 65534 --clear-groups test -x "$rille" 2>/dev/null; then
    as_user=(setpriv --reuid 65534 --regid 65534 --clear-groups env HOME=/nonexistent)
    mkdir "$work/user" && chown 65534:65534 "$work/user"
else
    mkdir "$work/user"
fi
cd "$work/user" || exit 1

queue() { squeue --noheader --array --format=%T 2>/dev/null; }
wait_for_queue() { # wait_for_queue [SECONDS]
    for _ in $(seq $((5 * ${1:-120}))); do
        [ -n "$(queue)" ] || return 0
        sleep 0.2
    done
    queue
    cat "$out"/slurm/*/*.log
    fail "the queue does not empty"
}
study() { "${as_user[@]}" "$rille" study "$work/in/study.yaml" -o "$out" "$@"; }
out=$work/user/out

# The cluster's warning comes 118 s before the end of a job of 3 minutes (and as Slurm says up to a
# minute earlier), while each point takes some 150 s: it is saved, the collection submits it again,
# and the next job goes on from there.
limit() {
    study_of "$work/in" 'slurm:' '  time: 1 s per point' '  memory: 300 MB' '  warn_before_kill: 118 s' \
        '  retries: {killed: 20}'
    sed -i 's/spacing: 8/spacing: 1/; s/rays_per_point: 8/rays_per_point: 64/' "$work/in/case.yaml"
    sed -i 's/, 150 V, 200 V//' "$work/in/study.yaml"
    sed -i 's/until: {reaches: bulk, at: trench centre}, no_longer_than: 3 s/time: 3 s/' "$work/in/case.yaml"
    sed -i 's/thickness: 14 nm/thickness: 4000 nm/' "$work/in/case.yaml"
    local begin took
    begin=$(date +%s%N)
    "$rille" study "$work/in/study.yaml" -o "$work/trial" --workers 2 --quiet || fail "trial: status $?"
    took=$((($(date +%s%N) - begin) / 1000000)) # ms
    sed -i "s/time: 3 s/time: $((3 * 150000 / took)) s/" "$work/in/case.yaml"
    chmod -R a+rX "$work/in"
    "$rille" study "$work/in/study.yaml" -o "$work/local" --workers 2 --quiet || fail "local: status $?"

    study --slurm --quiet || fail "submit: status $?"
    grep -q -e '--time=3$' "$out/slurm/0001/array_0.sh" || fail "$(cat "$out/slurm/0001/array_0.sh")"
    local stopped=0
    for _ in $(seq 1800); do # seen between two jobs
        [ ! -s "$out/points/.0001.stopped/state.bin" ] && [ ! -s "$out/points/.0002.stopped/state.bin" ] || stopped=1
        [ -n "$(queue)" ] || break
        sleep 0.5
    done
    wait_for_queue
    local logs="$out"/slurm/*/*.log
    [ $stopped = 1 ] || fail "no point has left its state: $(cat $logs)"
    grep -q 'were stopped before their end' $logs || fail "no task was stopped: $(cat $logs)"
    grep -q 'once more' "$out/slurm/0001/collect.log" || fail "$(cat "$out/slurm/0001/collect.log")"
    ! grep -q 'DUE TO TIME LIMIT' $logs || fail "a task was killed: the warning came to nothing"
    same_results "$work/local" "$out" || fail "other results than on this machine: $(cat $logs)"
    echo "2 points of some $((took * (3 * 150000 / took) / 3000)) s each: $(ls "$out/slurm" | wc -l) rounds"
}
if [ "${2:-}" = limit ]; then
    limit
    exit 0
fi

# Two points fail in numerics (the film is not reached in time), four do not.
study_of "$work/in" 'slurm:' '  partition: main' '  points_per_task: 2' '  at_most: 2 tasks' \
    '  time: 30 s per point' '  memory: 300 MB' '  warn_before_kill: 10 s' '  retries: {killed: 1}' \
    '  lines: ["export SEEN=yes"]'
sed -i 's/3 s}/3 s, must_end: true}/; s/spacing: 8/spacing: 2/' "$work/in/case.yaml"
chmod -R a+rX "$work/in"
"$rille" study "$work/in/study.yaml" -o "$work/local" --quiet
[ $? = 4 ] || fail "local: status $?"
study --slurm >text 2>errors || fail "submit: status $? $(cat errors)"
grep -q 'submitted 6 points in 3 tasks' text || fail "$(cat text)"
script=$out/slurm/0001/array_0.sh
for words in '--partition=.main' '--array=0-2%2' '--mem=300M' '--signal=B:TERM@10' '--time=3' 'export SEEN=yes'; do
    grep -q -e "$words" "$script" || fail "$words: $(cat "$script")"
done
# Asked again while it runs: nothing is submitted twice.
study --slurm --quiet || fail "asked again: status $?"
[ "$(ls "$out/slurm")" = 0001 ] || fail "submitted twice"

# One task dies with all its processes, in the middle of a point that would not have failed.
for _ in $(seq 600); do
    [ -n "$(ls -d "$out"/points/.000[3-6].* 2>/dev/null)" ] && break
    sleep 0.02
done
worker=$(ls -d "$out"/points/.000[3-6].* | head -n 1)
worker=${worker##*.}
task=$(awk '/^PPid/ { print $2 }' "/proc/$worker/status") || fail "no worker to kill"
kill -9 "$task" "$worker"
wait_for_queue
ls "$out"/slurm/0001/task_[0-9]*_0.log >/dev/null || fail "names of logs"
[ "$(ls "$out/slurm" | tr '\n' ' ')" = "0001 0002 " ] || fail "rounds: $(ls "$out/slurm") $(cat "$out"/slurm/*/*.log)"
[ "$(wc -l <"$out/slurm/0002/points.txt")" -le 2 ] || fail "more was tried again than was killed"
grep -q '^[01]$' "$out/slurm/0002/points.txt" && fail "a point that failed was tried again"
same_results "$work/local" "$out" || fail "other results than on this machine: $(cat "$out"/slurm/*/*.log)"

# Points that get lost are submitted alone.
rm -rf "$out/points/0004"
study --slurm >text || fail "resubmit: status $?"
grep -q 'submitted 1 points in 1 tasks' text || fail "$(cat text)"
wait_for_queue
same_results "$work/local" "$out" || fail "other results after a resubmission"
# Nothing is missing: the same command shows the results.
study --slurm >text
[ $? = 4 ] && grep -q '2 failed' text && grep -q 'results.csv' text || fail "complete: $(cat text)"

# What a person cancels is not submitted again; what was begun is taken up later, on this machine.
rm -rf "$out/points/0003" "$out/points/0005"
study --slurm >text || fail "submit: status $?"
for _ in $(seq 600); do
    [ -n "$(ls -d "$out"/points/.000[35].* 2>/dev/null)" ] && break
    sleep 0.02
done
scancel "$(sed -n 's/.*: job \([0-9]*\),.*/\1/p' text)"
wait_for_queue
grep -q 'cancelled' "$out/slurm/0004/collect.log" || fail "$(cat "$out"/slurm/0004/*.log)"
[ ! -e "$out/slurm/0005" ] || fail "submitted again after scancel"
study --quiet
[ $? = 4 ] && same_results "$work/local" "$out" || fail "taken up on this machine"
echo "submitted as $("${as_user[@]}" id -un 2>/dev/null || echo 65534) to two virtual nodes on one machine"
