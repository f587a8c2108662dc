#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The installer does nothing where nothing is missing; as another user it asks sudo for exactly what
# is missing, and without sudo it says what an administrator must run.
set -uo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
mkdir -p "$work"/{.ci,bin}
cp "$root/.ci/install.sh" "$work/.ci"
for tool in bash dirname grep cat; do ln -s "$(command -v $tool)" "$work/bin"; done
printf '#!/bin/bash\n[ "${@: -1}" = no-such-package ] || echo "ii "\n' >"$work/bin/dpkg-query"
printf '#!/bin/bash\necho 1000\n' >"$work/bin/id"
chmod -R a+rX "$work"; chmod +x "$work"/bin/{dpkg-query,id}
install() { PATH="$work/bin" bash "$work/.ci/install.sh" >"$work/output" 2>&1; }
fail() { echo "FAILED: $*"; cat "$work/output"; exit 1; }

printf 'here-already\n' >"$work/.ci/packages.txt"
install || fail "nothing was missing"
[ ! -s "$work/output" ] || fail "it should have said nothing"

printf 'here-already\nno-such-package\n' >"$work/.ci/packages.txt"
install && fail "a missing package without root or sudo passed"
grep -q 'apt-get install --no-install-recommends no-such-package$' "$work/output" || fail "no advice"

printf '#!/bin/bash\necho "$@" >>"%s"\n' "$work/asked" >"$work/bin/sudo"
chmod +x "$work/bin/sudo"
install || fail "with sudo"
grep -q 'apt-get.* update$' "$work/asked" || fail "the lists were not renewed"
grep -q 'apt-get.* install -y --no-install-recommends no-such-package$' "$work/asked" ||
    { cat "$work/asked"; fail "not what was missing"; }
