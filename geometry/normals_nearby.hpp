// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// Interval of psi = atan2(n.x, n.z) [rad]; low <= high, within [-pi, pi].
struct NormalRange {
    double low, high;
};

/// For every element of a contour: the normals of all elements whose centre lies within `radius`
/// [nm] of its own, straight through gas or solid. All of [-pi, pi] where the interval would reach
/// across psi = pi, and within `radius` of the sides. Needs a domain with a planar contour.
std::vector<NormalRange> normals_nearby(const Domain&, const Surface&, double radius);

} // namespace rille::geometry
