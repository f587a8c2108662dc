# SPDX-License-Identifier: Apache-2.0
# Sourced by the browser tests: makes $work and $scripts, where the test scripts lie beside the packages
# that they need. Where node, npm, chromium or the packages cannot be had the test is skipped (status
# 77), and says so.
set -euo pipefail
root=$(cd "$(dirname "${BASH_SOURCE[0]}")/../.." && pwd)
skip() { echo "skipped: $1"; exit 77; }
for program in node npm chromium; do
    command -v "$program" >/dev/null || skip "$program is not installed"
done
# Packages are installed once a build folder, beside copies of the scripts.
scripts=$PWD/browser
mkdir -p "$scripts"
cp "$root"/tests/browser/*.mjs "$root"/tests/browser/package.json "$scripts"
(
    flock 9
    [ -d "$scripts/node_modules/playwright-core" ] ||
        timeout 120 npm --prefix "$scripts" install --no-audit --no-fund --no-package-lock >"$scripts/npm.log" 2>&1
) 9>"$scripts/lock" || skip "npm cannot install playwright-core: $(tail -1 "$scripts/npm.log")"
CHROMIUM=$(command -v chromium)
export CHROMIUM
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
