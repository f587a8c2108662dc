# SPDX-License-Identifier: Apache-2.0
# For tests of studies: sourced with $rille, $root and $work set.
fail() { echo "FAILED: $*"; exit 1; }

study_of() { # study_of FOLDER [LINE...]: the small study with lines added, beside its case
    mkdir -p "$1"
    cp "$root/tests/data/study/case.yaml" "$root/tests/data/study/study.yaml" "$1"
    local line
    for line in "${@:2}"; do echo "$line" >>"$1/study.yaml"; done
}

same_results() { # same_results A B: every column but the seconds, every file of every point
    cmp <(sed 's/,[^,]*$//' "$1/results.csv") <(sed 's/,[^,]*$//' "$2/results.csv") || return 1
    [ "$(ls -A "$1/points")" = "$(ls -A "$2/points")" ] || { ls -A "$2/points"; return 1; }
    local point file
    for point in "$1"/points/*; do
        [ "$(ls -A "$point")" = "$(ls -A "$2/points/${point##*/}")" ] || return 1
        for file in metrics.json profile.csv; do
            [ ! -e "$point/$file" ] || cmp "$point/$file" "$2/points/${point##*/}/$file" || return 1
        done
    done
}
