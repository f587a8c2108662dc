// SPDX-License-Identifier: Apache-2.0
// Exact surfaces of revolution for tests of rays and fluxes.
#pragma once

#include "tests/support/shapes.hpp"

namespace rille::tests {

inline Domain round_cell(int cells, double spacing = 1) {
    return {geometry::Symmetry::revolved, geometry::Sides::mirror, spacing, cells, 1};
}

/// Areas of whole frusta in place of lengths.
inline void revolve(Surface& s) {
    const double pi = 3.14159265358979323846;
    for (std::size_t e = 0; e < s.size(); ++e)
        s.area[e] = 2 * pi * s.centre[e].x * s.length(static_cast<int>(e));
}

/// Through `points` from the axis to the outer side, the gas on the left.
inline Surface frusta(const Domain& domain, const std::vector<Vec3>& points, double max_length) {
    Surface s = polyline(domain, points, max_length);
    revolve(s);
    return s;
}

/// Vertical round hole, top at z = 0.
inline Surface round_hole(const Domain& domain, double radius, double depth, double max_length) {
    return frusta(domain,
                  {{0, 0, -depth}, {radius, 0, -depth}, {radius, 0, 0}, {domain.width_x(), 0, 0}},
                  max_length);
}

} // namespace rille::tests
