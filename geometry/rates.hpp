// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

#include <vector>

namespace rille::geometry {

/// The speed of the front at every surface element as a function of the surface normal, at fixed
/// arrivals, for every material in reach of the step. Positive = etching (the solid recedes),
/// negative = growth; nm/s.
///
/// The normal enters through one angle. extruded and revolved: psi = atan2(n.x, n.z) in [-pi, pi].
/// full: the angle between n and +z in [0, pi], n turned in the vertical plane of the element's own
/// normal. `angles` is shared by all tables, strictly increasing, covers the whole interval, and is
/// dense where the rates bend (near walls under a narrow beam). Between angles rates are linear.
struct NormalRates {
    std::vector<double> angles; ///< [rad]
    std::vector<int> first_row; ///< size elements + 1: rows [first_row[e], first_row[e + 1])
    std::vector<int> material;  ///< per row
    std::vector<double> table;  ///< row-major: rows x angles.size() [nm/s]

    /// Row of element e for `material`, or -1 (rate 0).
    int row(int element, int wanted) const {
        for (int r = first_row[element]; r < first_row[element + 1]; ++r)
            if (material[r] == wanted) return r;
        return -1;
    }
};

} // namespace rille::geometry
