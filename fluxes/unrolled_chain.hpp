// SPDX-License-Identifier: Apache-2.0
// Private to fluxes.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

struct PlanePoint {
    double x = 0, z = 0;
};

/// The part of an extruded surface that is open to the source (chain 0), from its highest vertex
/// over one full period of what the sides make of it: one period of the surface, or with mirror
/// sides two. Nothing beyond the ends can be seen from below them. Positions run on continuously,
/// by whole periods or by reflection.
struct UnrolledChain {
    std::vector<PlanePoint> point; ///< one more than segments
    std::vector<int> element;      ///< per segment: the element it is, or is the image of
    std::vector<char> image;       ///< per segment: whether it is a reflection
    std::vector<int> position;     ///< per element of the surface: its segment, or -1
};

/// Throws std::logic_error unless chain 0 spans the period.
UnrolledChain unroll(const geometry::Domain&, const geometry::Surface&);

} // namespace rille::fluxes
