#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The reports on studies (forty points of which some failed, none, one, all failed, forty of a hypercube,
# ten thousand) and on points side by side, in a browser.
. "$(dirname "$0")/browser.bash"
rille=$1
node "$scripts/study_folder.mjs" "$work"
for study in study empty one failed spread large; do
    "$rille" report "$work/$study" --quiet
done
"$rille" report "$work"/study/points/0005 "$work"/study/points/0008 "$work"/study/points/0016 \
    -o "$work/compare" --quiet
for file in study/answer.svg study/answer.png; do
    [ -s "$work/$file" ] || { echo "FAILED: no $file"; exit 1; }
done
[ ! -e "$work/empty/answer.svg" ] || { echo "FAILED: a curve of nothing"; exit 1; }
[ -z "${PAGES:-}" ] || cp -r "$work" "$PAGES"
node "$scripts/study_page.mjs" "$work"
