// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

namespace rille::geometry {

/// `extruded`: trench or line, nothing varies along y; particles still move in three dimensions.
/// `full`: anything that repeats in x and y.
enum class Symmetry { extruded, full };

/// What happens at the sides of the simulated period.
enum class Sides { mirror, periodic };

/// The simulated period and its grid. The period is centred: x in [-width_x()/2, width_x()/2].
///
/// Grid node (i, j, k) sits at x = x_min() + (i + 1/2) h, y likewise, z = (k + 1/2) h with
/// 0 <= i < cells_x, 0 <= j < cells_y and any integer k. The sides lie half a cell outside the
/// outermost nodes, so mirror and periodic neighbours are nodes themselves. In `extruded`,
/// cells_y is 1 and the only layer of nodes sits at y = 0.
struct Domain {
    Symmetry symmetry = Symmetry::extruded;
    Sides sides = Sides::mirror;
    double spacing = 1.0; ///< h [nm], > 0, the same along x, y and z
    int cells_x = 1;
    int cells_y = 1;

    double width_x() const { return cells_x * spacing; }
    double width_y() const { return cells_y * spacing; }
    double x_min() const { return -0.5 * width_x(); }
    double y_min() const { return -0.5 * width_y(); }
    bool extruded() const { return symmetry == Symmetry::extruded; }

    Vec3 node(int i, int j, int k) const {
        return {x_min() + (i + 0.5) * spacing, y_min() + (j + 0.5) * spacing, (k + 0.5) * spacing};
    }
};

} // namespace rille::geometry
