#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A film that grows closes the narrow openings of a study: those points are clogged, which is a
# result with a bound, the other points go on, and table and page say so.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
. "$root/tests/support/study.sh"
cd "$work" || exit 1
cp -r "$root/tests/data/study_clogging" in

"$rille" study in/study.yaml -o out --workers 2 >text 2>/dev/null || fail "status $? $(cat text)"
grep -q '6 of 6 points' text && grep -Eq '^ +1 clogged$' text && grep -Eq '^ +5 done$' text || fail "$(cat text)"
cut -d, -f1-4 out/results.csv | grep -v '^#' >cells
cat >wanted <<'T'
point,status,time_s,cd_nm
0001,done,10,20
0002,done,10,40
0003,done,10,60
0004,clogged,30,20
0005,done,30,40
0006,done,30,60
T
cmp cells wanted || fail "$(cat cells)"
python3 - <<'P' || exit 1
import csv, json, re
rows = {r["point"]: r for r in csv.DictReader(l for l in open("out/results.csv") if l[0] != "#")}
for name, row in rows.items():  # a closed opening has no depth; what can be measured is there
    assert bool(row["depth_centre_nm"]) == (name != "0004") and row["mask_left_nm"], row
point = json.load(open("out/points/0004/point.json"))
assert point["status"] == "clogged" and point["exit_status"] == 0, point
assert any("void has closed off" in w or "is filled" in w for w in point["warnings"]), point["warnings"]
page = open("out/report.html").read()
assert "Clogged" in page and "an opening closed" in page
assert "No value from 1 point: 0004 (clogged)." in page
table = json.loads(re.search(r'<script type="application/json" id="study-points">(.*?)</script>', page, re.S)[1])
status = table["cells"][1]
assert status["words"][status["at"][3]] == "clogged", status
metric = json.load(open("out/points/0004/metrics.json"))["metrics"][0]
assert metric["name"] == "depth centre" and metric["note"] == "the feature is closed", metric
P
# A clogged point has its result: it is not done again, and the exit status was 0.
cp out/results.csv before
"$rille" study in/study.yaml -o out --quiet || fail "again: status $?"
cmp before out/results.csv || fail "the table has changed"
# A film that does not grow closes nothing: the same study with a thousandth of the flux.
sed -i 's/2.4e15/2.4e12/' in/case.yaml
"$rille" study in/study.yaml -o open --quiet || fail "open: status $?"
[ "$(grep -c ',clogged,' open/results.csv)" = 0 ] || fail "clogged without growth"
exit 0
