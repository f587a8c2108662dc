#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Every source is formatted as .clang-format says, by the version that packages-tests.txt names. The same
# check must find a fault that is put into a copy.
set -euo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)
format=clang-format-14

mapfile -t sources < <(find "$root"/{geometry,fluxes,engine,tests} -name '*.cpp' -o -name '*.hpp' | sort)
[ ${#sources[@]} -gt 100 ] || { echo "only ${#sources[@]} sources found"; exit 1; }
"$format" --style=file --dry-run -Werror "${sources[@]}" ||
    { echo "to format: $format -i FILE"; exit 1; }

copy=$(mktemp -d)
trap 'rm -rf "$copy"' EXIT
cp "$root/.clang-format" "$copy"
printf 'int main() {\n  return 0;\n}\n' >"$copy/fault.cpp"
if "$format" --style=file --dry-run -Werror "$copy/fault.cpp" 2>/dev/null; then
    echo "not detected: an indent of two"
    exit 1
fi
echo "${#sources[@]} sources are formatted; 1 seeded fault found"
