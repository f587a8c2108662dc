// SPDX-License-Identifier: Apache-2.0
// Private to geometry: find_isolated_parts of topology.hpp on the surface alone.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/topology.hpp"

#include <vector>

namespace rille::geometry {

/// Volumes and centres follow from the surface by Gauss's theorem with the field (0, 0, z), which
/// sides do not enter. A sheet that spans the whole period bounds a part together with the next
/// sheet above it. A part's volume is that within its own outline: what lies inside it in turn is
/// not subtracted.
std::vector<IsolatedPart> find_isolated_parts(const Domain&, const Surface&);

} // namespace rille::geometry
