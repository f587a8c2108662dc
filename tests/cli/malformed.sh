#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Every malformed case file ends with status 3 and messages that name the file; a good one with 0.
set -uo pipefail
rille=$1
data=$(cd "$(dirname "$0")/../data/malformed" && pwd)
failed=0
count=0
for file in "$data"/*.yaml; do
    output=$("$rille" check "$file" 2>&1 >/dev/null)
    status=$?
    count=$((count + 1))
    if [ $status != 3 ] || [[ $output != *"$(basename "$file"):"* ]]; then
        echo "FAILED: $(basename "$file"): status $status: $output"
        failed=1
    fi
done
[ $count -ge 20 ] || { echo "FAILED: only $count files"; failed=1; }
"$rille" check "$data/../../../examples/poly-trench/case.yaml" >/dev/null || { echo "FAILED: a good case"; failed=1; }
exit $failed
