#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Installs what is needed, builds rille and runs every test. --long adds the long tier.
#   bash tests/run.sh [--long]
set -euo pipefail
cd "$(dirname "$0")/.."
tier=()
case "${1:-}" in
    "") ;;
    --long) tier=(-C long) ;;
    *) echo "usage: bash tests/run.sh [--long]" >&2; exit 2 ;;
esac
bash .ci/install.sh tests
cmake -S . -B build -DCMAKE_BUILD_TYPE=Release -DRILLE_BUILD_TESTS=ON >build-configure.log 2>&1 ||
    { cat build-configure.log; exit 1; }
rm -f build-configure.log
cmake --build build --parallel "$(nproc)"
ctest --test-dir build --parallel "$(nproc)" --output-on-failure --timeout 1200 "${tier[@]}"
