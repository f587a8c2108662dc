// SPDX-License-Identifier: Apache-2.0
// Private to geometry: elements that reach over a periodic side are cut there, and what lies beyond
// comes back in at the other side.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <vector>

namespace rille::geometry {

/// Cuts the elements (`corners` and `vertices` only) at the sides of a periodic domain. Elements
/// may reach out by less than a period. Returns for every resulting element the one it came from.
std::vector<int> clip_to_period(const Domain&, Surface&);

} // namespace rille::geometry
