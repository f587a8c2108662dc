// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

namespace rille::geometry {

/// A place on the surface seen from element centres: a value there is
/// (1 - share) value[element] + share value[partner].
struct BetweenCentres {
    int element = -1;
    int partner = -1; ///< neighbour on that side, or -1: none, or beyond a corner
    double share = 0; ///< in [0, 1)
};

/// Linear interpolation along the chain of a contour; `foot` on or near `element`. A foot
/// on a vertex gives the same value whichever of the two elements it is counted to. In full the
/// element alone counts.
BetweenCentres between_centres(const Domain&, const Surface&, int element, Vec3 foot);

} // namespace rille::geometry
