// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"

#include <string>

namespace rille::engine {

/// A parameter that no source settles: "yields.silicon bare.energy.threshold", illustrative or from
/// memory.
struct OpenParameter {
    std::string name;
    fluxes::Standing standing = fluxes::Standing::illustrative;
};

} // namespace rille::engine
