#!/bin/bash
# SPDX-License-Identifier: Apache-2.0
# Builds in Release and prints one JSON object a line: bash tests/bench/run.sh [BUILD_FOLDER]
set -euo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)
build=${1:-$root/build/bench}
{
    cmake -S "$root" -B "$build" -DCMAKE_BUILD_TYPE=Release -DRILLE_BUILD_TESTS=OFF \
        -DRILLE_BUILD_BENCH=ON
    cmake --build "$build" -j "$(nproc)" --target bench_rays bench_advance bench_neutrals bench_sheath bench_study
} >&2
for bench in bench_rays bench_advance bench_neutrals bench_sheath bench_study; do
    "$build/tests/bench/$bench"
done
