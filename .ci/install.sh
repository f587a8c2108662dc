#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Installs the Debian 12 packages of packages.txt that are missing, with `tests` those of
# packages-tests.txt as well, and of packages-cluster.txt those that can be had: as root, else with sudo; else says what an administrator must run. Does
# nothing, and needs no network, when all are there. A line `package command` is not needed where the
# command is there already.
#   bash .ci/install.sh [tests]
set -euo pipefail
here=$(cd "$(dirname "$0")" && pwd)
lists=("$here/packages.txt")
[ "${1:-}" != tests ] || lists+=("$here/packages-tests.txt")
# Packages of these lists that are not there.
missing_of() {
    local package command
    while read -r package command; do
        [ -n "$package" ] || continue
        [ -z "$command" ] || ! PATH=$PATH:/usr/sbin:/sbin command -v "$command" >/dev/null || continue
        dpkg-query -W -f '${db:Status-Abbrev}' "$package" 2>/dev/null | grep -q '^ii' || echo "$package"
    done < <(cat "$@")
}
mapfile -t missing < <(missing_of "${lists[@]}")
cluster=()
[ "${1:-}" != tests ] || mapfile -t cluster < <(missing_of "$here/packages-cluster.txt")
[ $((${#missing[@]} + ${#cluster[@]})) -gt 0 ] || exit 0

if [ "$(id -u)" = 0 ]; then as_root=()
elif command -v sudo >/dev/null; then as_root=(sudo)
elif [ ${#missing[@]} -gt 0 ]; then
    echo "These Debian packages are missing and this user may not install them: ${missing[*]}" >&2
    echo "Ask an administrator to run: apt-get install --no-install-recommends ${missing[*]}" >&2
    exit 1
else
    echo "the test on a cluster will be skipped; it needs: ${cluster[*]}"
    exit 0
fi
install() {
    "${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get -qq -o DPkg::Lock::Timeout=300 install -y \
        --no-install-recommends "$@" >/dev/null
}
# Packages of daemons start them when they are installed, unless this file says no.
no_daemons=/usr/sbin/policy-rc.d
if [ ${#cluster[@]} -gt 0 ] && [ ! -e $no_daemons ]; then
    printf '#!/bin/sh\nexit 101\n' | "${as_root[@]}" tee $no_daemons >/dev/null
    "${as_root[@]}" chmod 755 $no_daemons
    trap '"${as_root[@]}" rm -f $no_daemons' EXIT
fi
echo "installing $((${#missing[@]} + ${#cluster[@]})) Debian packages"
"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get -qq -o DPkg::Lock::Timeout=300 update
[ ${#missing[@]} = 0 ] || install "${missing[@]}"
[ ${#cluster[@]} = 0 ] || install "${cluster[@]}" ||
    echo "the test on a cluster will be skipped; these could not be installed: ${cluster[*]}"
