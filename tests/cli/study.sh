#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A study from one end to the other: plan, points, table, statuses, what is refused, what is done
# again, a stop and what follows.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
. "$root/tests/support/study.sh"
study_of "$work/in"
cd "$work" || exit 1

# The plan alone writes nothing.
"$rille" study in/study.yaml -o out --plan >plan || fail "plan: status $?"
grep -q '6 runs' plan && grep -q 'files' plan && grep -q 'constant: ' plan || fail "$(cat plan)"
[ ! -e out ] || fail "--plan has written something"

# 14 nm are reached in 3 s from 150 V on.
"$rille" study in/study.yaml -o out --workers 2 >text 2>/dev/null || fail "study: status $? $(cat text)"
grep -q '6 of 6 points' text && grep -q 'table: out/results.csv' text || fail "$(cat text)"
cut -d, -f1-4 out/results.csv | grep -v '^#' >cells
cat >wanted <<'T'
point,status,amplitude_V,cd_nm
0001,not cleared,100,32
0002,not cleared,100,40
0003,done,150,32
0004,done,150,40
0005,done,200,32
0006,done,200,40
T
cmp cells wanted || fail "$(cat cells)"
for name in study.yaml study.json base/case.yaml points/0006/point.json; do
    [ -s "out/$name" ] || fail "no $name"
done
[ "$(ls -A out/points/0001 | tr '\n' ' ')" = "metrics.json point.json profile.csv " ] || fail "keep"
[ "$(ls -A out/points | wc -l)" = 6 ] || fail "left behind: $(ls -A out/points)"

# Again: nothing to do, and the same table. From the study that lies in the folder too.
cp out/results.csv before
"$rille" study in/study.yaml -o out --quiet || fail "again: status $?"
"$rille" study out/study.yaml -o out --quiet || fail "from the folder: status $?"
cmp before out/results.csv || fail "the table has changed"
# One worker with other threads, another folder: the same bits.
"$rille" study in/study.yaml -o other --workers 1 --threads 2 --quiet || fail "status $?"
same_results out other || fail "one worker, two threads"

refused() { # refused STATUS WORDS COMMAND...: before anything runs
    local status=$1 words=$2 got
    shift 2
    "$@" >text 2>errors
    got=$?
    [ $got = "$status" ] && grep -q "$words" errors || fail "$words: status $got, $(cat errors)"
}
refused 5 'not that of a study' "$rille" study in/study.yaml -o in
sed 's/200 V/220 V/' in/study.yaml >in/changed.yaml
refused 5 'another study' "$rille" study in/changed.yaml -o out
cp -r out old
sed -i 's/"rille": "[^"]*"/"rille": "0.0.9"/' old/study.json
refused 5 'begun by rille 0.0.9' "$rille" study in/study.yaml -o old
echo '{}' >old/study.json
refused 5 'not one that this version writes' "$rille" study in/study.yaml -o old
touch file
refused 5 'no folder' "$rille" study in/study.yaml -o file
refused 3 'no such file' "$rille" study other/none.yaml -o new
[ ! -e new ] || fail "a folder of a study that cannot be read"
touch other/mine
"$rille" study in/changed.yaml -o other --force --quiet || fail "--force: status $?"
[ "$(grep -c '^00.*,220,' other/results.csv)" = 2 ] && [ -e other/mine ] || fail "--force"
# What does not change a point may change: here the answer.
sed 's/y: bow/y: undercut/' in/study.yaml >in/answer.yaml
"$rille" study in/answer.yaml -o out --quiet || fail "another answer: status $?"
grep -q '"y": "undercut"' out/study.json || fail "study.json keeps the old answer"

# A point that fails is recorded with its error and all its files, and the rest go on.
sed -i 's/no_longer_than: 3 s/no_longer_than: 3 s, must_end: true/' in/case.yaml
"$rille" study in/study.yaml -o failing >text 2>/dev/null
[ $? = 4 ] || fail "failed points: status $?"
grep -q '2 failed' text && grep -q 'point 0001 failed: ' text && grep -q 'retry' text || fail "$(cat text)"
[ "$(grep -c '^000[12],failed,' failing/results.csv)" = 2 ] || fail "rows of failed points"
[ "$(grep -c '^000[3-6],done,' failing/results.csv)" = 4 ] || fail "rows beside failed points"
for name in case.yaml run.json history.csv frames/frame_0000.vtp; do
    [ -s "failing/points/0001/$name" ] || fail "a failed point has lost $name"
done
cp failing/results.csv before
"$rille" study in/study.yaml -o failing --quiet
[ $? = 4 ] && cmp before failing/results.csv || fail "a failed point was tried again unasked"

# Told to stop in the middle: status, what is there is put together, the same command goes on.
for signal in INT:130 TERM:143; do
    study_of stop && sed -i 's/spacing: 8/spacing: 4/' stop/case.yaml
    [ -e whole ] || "$rille" study stop/study.yaml -o whole --quiet || fail "status $?"
    rm -rf stopped
    "$rille" study stop/study.yaml -o "$work/stopped" --workers 2 >text 2>/dev/null &
    pid=$!
    for _ in $(seq 600); do [ -e stopped/points/0001 ] && break; sleep 0.05; done
    kill -"${signal%:*}" $pid
    wait $pid
    status=$?
    [ $status = "${signal#*:}" ] || fail "stopped: status $status"
    grep -q 'missing' text && grep -q 'the same command goes on' text || fail "$(cat text)"
    pgrep -f "study-worker $work/stopped" >/dev/null && fail "workers outlive the study"
    "$rille" study stop/study.yaml -o "$work/stopped" --quiet || fail "taken up: status $?"
    same_results whole stopped || fail "after $signal"
done

# A point that is told to stop saves its state, for whoever comes next.
study_of kill 'slurm: {retries: {killed: 0}}'
sed -i 's/spacing: 8/spacing: 1/; s/14 nm/60 nm/; s/3 s}/60 s}/' kill/case.yaml
sed -i 's/, 150 V, 200 V//' kill/study.yaml
begun() { # begun POINT: waits until a worker has begun with it
    for _ in $(seq 600); do ls -A killed/points 2>/dev/null | grep -q "^\.$1\..*[0-9]\$" && return; sleep 0.02; done
    fail "point $1 is not begun"
}
"$rille" study kill/study.yaml -o killed --workers 1 >text 2>/dev/null &
pid=$!
begun 0001
sleep 0.5
kill -TERM $pid
wait $pid
[ $? = 143 ] && [ -s killed/points/.0001.stopped/state.bin ] || fail "no state: $(ls -A killed/points)"

# A worker that is killed takes its point with it, here without another try.
"$rille" study kill/study.yaml -o killed --workers 1 >text 2>errors &
pid=$!
begun 0001
kill -9 "$(pgrep -P $pid)"
begun 0002
kill -9 "$(pgrep -P $pid)"
wait $pid
status=$?
[ $status = 4 ] || fail "killed points: status $status $(cat errors text)"
grep -q '2 killed' text || fail "$(cat text)"
[ "$(grep -c '^000[12],killed,.*signal 9' killed/results.csv)" = 2 ] || fail "rows of killed points"
exit 0
