#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Installs the Debian 12 packages of packages.txt that are missing, with `tests` those of
# packages-tests.txt as well: as root, else with sudo; else says what an administrator must run. Does
# nothing, and needs no network, when all are there. A line `package command` is not needed where the
# command is there already.
#   bash .ci/install.sh [tests]
set -euo pipefail
here=$(cd "$(dirname "$0")" && pwd)
lists=("$here/packages.txt")
[ "${1:-}" != tests ] || lists+=("$here/packages-tests.txt")
missing=()
while read -r package command; do
    [ -n "$package" ] || continue
    [ -z "$command" ] || ! command -v "$command" >/dev/null || continue
    dpkg-query -W -f '${db:Status-Abbrev}' "$package" 2>/dev/null | grep -q '^ii' || missing+=("$package")
done < <(cat "${lists[@]}")
[ ${#missing[@]} -gt 0 ] || exit 0

if [ "$(id -u)" = 0 ]; then as_root=()
elif command -v sudo >/dev/null; then as_root=(sudo)
else
    echo "These Debian packages are missing and this user may not install them: ${missing[*]}" >&2
    echo "Ask an administrator to run: apt-get install --no-install-recommends ${missing[*]}" >&2
    exit 1
fi
echo "installing ${#missing[@]} Debian packages"
"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get -qq -o DPkg::Lock::Timeout=300 update
"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get -qq -o DPkg::Lock::Timeout=300 install -y \
    --no-install-recommends "${missing[@]}" >/dev/null
