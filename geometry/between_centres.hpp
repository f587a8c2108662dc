// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

/// A place on the surface seen from element centres: a value there is value_between() of that of
/// the element and that of its partner.
struct BetweenCentres {
    int element = -1;
    int partner = -1; ///< neighbour on that side; beyond the last centre before a corner the one
                      ///< on the other side; -1: none, or its own image in a mirror
    double share = 0; ///< in (-1, 1); < 0: the place lies on the side away from the partner
};

/// Value at a place, from that of its element and that of its partner. Away from the partner it is
/// extrapolated, by no more than the element's own value.
inline double value_between(double own, double other, double share) {
    const double step = share * (other - own);
    const double most = std::fabs(own);
    return own + (share < 0 ? std::clamp(step, -most, most) : step);
}

/// Linear along the chain of a contour; `foot` on or near `element`. A foot on a vertex gives the
/// same value whichever of the two elements it is counted to. Next to a corner the elements come
/// and go from step to step: a value that stayed that of the last centre there would jump with
/// them. In full the element alone counts.
BetweenCentres between_centres(const Domain&, const Surface&, int element, Vec3 foot);

} // namespace rille::geometry
