#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Exit status and first words of the program: usage, input, file errors, and what is left alone.
set -uo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
failed=0

expect() { # expect STATUS PATTERN COMMAND...
    local status=$1 pattern=$2
    shift 2
    "$@" >"$work/output" 2>&1 </dev/null
    local got=$?
    if [ $got != "$status" ] || ! grep -qE -- "$pattern" "$work/output"; then
        echo "FAILED: $* : status $got (wanted $status), output (wanted /$pattern/):"
        head -n 12 "$work/output"
        failed=1
    fi
}

case=$root/examples/poly-trench/case.yaml
expect 0 'Etch a case' "$rille" --help
expect 0 'not a released recipe' "$rille" run --help
expect 0 '^rille [0-9]' "$rille" --version
expect 0 '"\$schema"' "$rille" schema
expect 2 'subcommand' "$rille"
expect 2 'nonsense' "$rille" run --nonsense "$case"
expect 2 'unknown option "--thread" of rille run; did you mean "--threads"' "$rille" run "$case" --thread 2
expect 2 'unknown command "rn"; .*did you mean "run"' "$rille" rn "$case"
expect 2 'seed: -1' "$rille" run "$case" --seed -1
expect 2 'not expected' "$rille" check --set 'spacing=4 nm' 'mask.thickness=90 nm' "$case"
expect 3 'is a folder' "$rille" check "$root/examples/poly-trench"
expect 2 'threads' "$rille" run "$case" --threads 0
expect 3 'missing.yaml' "$rille" check "$work/missing.yaml"
expect 3 'case.yaml:1:1' bash -c "printf 'nothing: 1\n' >'$work/case.yaml'; '$rille' check '$work/case.yaml'"
# A folder that cannot be made is found before anything is computed.
touch "$work/file"
expect 5 "$work/file" timeout 5 "$rille" run "$case" -o "$work/file/out"
# A folder that holds something is not overwritten.
mkdir "$work/full" && echo precious >"$work/full/notes.txt"
expect 5 'full' timeout 5 "$rille" run "$case" -o "$work/full"
[ "$(cat "$work/full/notes.txt")" = precious ] || { echo "FAILED: a file was touched"; failed=1; }
# What `check` prints is a case, which says the same again (but for the time and memory, which it
# measures).
"$rille" check "$case" >"$work/shown.yaml"
"$rille" check "$work/shown.yaml" | grep -vE '^# (time|memory)' >"$work/again.yaml"
grep -q '^# memory' "$work/shown.yaml" || { echo "FAILED: no estimate"; failed=1; }
grep -vE '^# (time|memory)' "$work/shown.yaml" | cmp - "$work/again.yaml" || { echo "FAILED: check of a checked case"; failed=1; }
# Where root does not write past permissions: a folder that is not ours.
mkdir -m 555 "$work/locked"
if [ "$(id -u)" != 0 ]; then
    expect 5 'locked' timeout 5 "$rille" run "$case" -o "$work/locked/out"
fi
exit $failed
