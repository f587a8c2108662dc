#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Installs what is needed, builds rille, etches the first example and says where the result is.
set -euo pipefail
cd "$(dirname "$0")/.."
bash .ci/install.sh
cmake -S . -B build -DCMAKE_BUILD_TYPE=Release -DRILLE_BUILD_TESTS=OFF >/dev/null
cmake --build build --parallel "$(nproc)" --target rille
out=${1:-out/poly-trench}
build/rille run examples/poly-trench/case.yaml -o "$out" --force
echo
echo "The report, for a browser: $out/report.html"
echo "The profile as a picture:   $out/profile.svg (and profile.png)"
echo "Every number:               $out/metrics.json, history.csv, profile.csv"
