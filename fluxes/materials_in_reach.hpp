// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <vector>

namespace rille::fluxes {

/// Materials that a step may meet at each element, outermost first: reach[first[e]..first[e + 1]).
struct MaterialsInReach {
    std::vector<int> first;
    std::vector<int> material;

    int outermost(int element) const { return material[first[element]]; }
};

} // namespace rille::fluxes
