#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Includes go one way: geometry <- fluxes <- engine; OpenVDB stays inside geometry, yaml-cpp inside
# engine. The same check must find a fault that is put into a copy.
set -euo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)

violations() { # prints each include that goes against the order below folder $1
    grep -rnE '#include *[<"](fluxes|engine)/' "$1/geometry" || :
    grep -rnE '#include *[<"]engine/' "$1/fluxes" || :
    grep -rnE '#include *[<"]openvdb/' "$1/fluxes" "$1/engine" || :
    grep -rnE '#include *[<"]yaml-cpp/' "$1/geometry" "$1/fluxes" || :
}

found=$(violations "$root")
[ -z "$found" ] || { echo "includes against the folder order:"; echo "$found"; exit 1; }

copy=$(mktemp -d)
trap 'rm -rf "$copy"' EXIT
for fault in 'geometry:#include "fluxes/ions.hpp"' 'fluxes:#include "engine/case.hpp"' \
             'engine:#include <openvdb/openvdb.h>' 'fluxes:#include <yaml-cpp/yaml.h>'; do
    rm -rf "${copy:?}"/*
    mkdir -p "$copy"/{geometry,fluxes,engine}
    echo "${fault#*:}" >"$copy/${fault%%:*}/fault.cpp"
    [ -n "$(violations "$copy")" ] || { echo "not detected: $fault"; exit 1; }
done
echo "folder order holds; 4 seeded faults found"
