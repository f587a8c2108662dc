#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The report of a run in a browser: a short coarse trench, a run that failed, folders that hold only
# part of a run, and a hole in three dimensions.
. "$(dirname "$0")/browser.bash"
rille=$1

trench() { # trench FOLDER [OPTION...]
    "$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=10 nm' \
        --set sampling.ions_per_species=256 --set sampling.rays_per_point=16 -o "$work/$1" --quiet "${@:2}"
}
trench done --set 'recipe.steps.main.no_longer_than=8 s'
# Told to stop in the middle.
"$rille" run "$root/examples/poly-trench/case.yaml" --set 'spacing=4 nm' \
    --set sampling.ions_per_species=256 -o "$work/stopped" --quiet 2>/dev/null &
pid=$!
for _ in $(seq 600); do [ -e "$work/stopped/frames/frame_0002.vtp" ] && [ -e "$work/stopped/state.bin" ] && break; sleep 0.1; done
kill -INT $pid
status=0
wait $pid || status=$?
[ $status = 130 ] || { echo "FAILED: status $status, wanted 130"; exit 1; }
status=0
trench failed --set 'recipe.steps.main.no_longer_than=1 s' --set recipe.steps.main.must_end=true \
    2>/dev/null || status=$?
[ $status = 4 ] || { echo "FAILED: status $status, wanted 4"; exit 1; }
# As SIGKILL leaves one that was going on, one whose state is gone too, and as a study keeps it.
cp -r "$work/done" "$work/killed"
(cd "$work/killed" && rm run.json metrics.json history.csv profile.* report.html)
cp -r "$work/stopped" "$work/alive"
(cd "$work/alive" && rm run.json metrics.json history.csv profile.* report.html)
cp -r "$work/done" "$work/kept"
(cd "$work/kept" && rm -r frames front.pvd report.html)
"$rille" report "$work/killed" --quiet
"$rille" report "$work/alive" --quiet
"$rille" report "$work/kept" --quiet
sed -e 's/spacing: 4 nm/spacing: 12 nm/' -e 's/until: {reaches: stop, at: hole centre}, no_longer_than: 120 s/time: 1 s/' \
    "$root/examples/contact-via/case.yaml" >"$work/hole.yaml"
"$rille" run "$work/hole.yaml" --set sampling.ions_per_species=256 --set sampling.rays_per_point=16 \
    -o "$work/hole" --quiet
for page in done hole; do
    size=$(stat -c %s "$work/$page/report.html")
    [ "$size" -lt 2000000 ] || { echo "FAILED: the report of $page has $size bytes"; exit 1; }
done
node "$scripts/run_page.mjs" "$work"
