#!/bin/bash
# SPDX-License-Identifier: Apache-2.0
# Builds in Release and prints one JSON object a line: bash tests/bench/run.sh [BUILD_FOLDER]
set -euo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)
benches=(bench_rays bench_advance bench_neutrals bench_neutrals_full bench_sheath bench_study
    bench_threads bench_growth)
build=${1:-$root/build/bench}
{
    cmake -S "$root" -B "$build" -DCMAKE_BUILD_TYPE=Release -DRILLE_BUILD_TESTS=OFF \
        -DRILLE_BUILD_BENCH=ON
    cmake --build "$build" -j "$(nproc)" --target "${benches[@]}"
} >&2
for bench in "${benches[@]}"; do
    "$build/tests/bench/$bench"
done
