// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

namespace rille::geometry {

/// `extruded`: trench or line, nothing varies along y; particles still move in three dimensions.
/// `full`: anything that repeats in x and y.
/// `revolved`: round about the axis x = y = 0; the front is a contour in the half-plane y = 0,
/// x >= 0, where x is the distance from the axis; particles move in three dimensions.
enum class Symmetry { extruded, full, revolved };

/// What happens at the sides of the simulated period.
enum class Sides { mirror, periodic };

/// The simulated period and its grid. The period is centred, x in [-width_x()/2, width_x()/2]; in
/// `revolved` it runs from the axis to the radius of the round cell, x in [0, width_x()], the
/// sides are mirrors, and rays are reflected by the cylinder x = width_x().
///
/// Grid node (i, j, k) sits at x = x_min() + (i + 1/2) h, y likewise, z = (k + 1/2) h with
/// 0 <= i < cells_x, 0 <= j < cells_y and any integer k. The sides lie half a cell outside the
/// outermost nodes, so mirror and periodic neighbours are nodes themselves; the axis is a mirror to
/// the front. In `extruded` and `revolved`, cells_y is 1 and the only layer of nodes sits at y = 0.
struct Domain {
    Symmetry symmetry = Symmetry::extruded;
    Sides sides = Sides::mirror;
    double spacing = 1.0; ///< h [nm], > 0, the same along x, y and z
    int cells_x = 1;
    int cells_y = 1;

    double width_x() const { return cells_x * spacing; }
    double width_y() const { return cells_y * spacing; }
    double x_min() const { return revolved() ? 0.0 : -0.5 * width_x(); }
    double x_max() const { return x_min() + width_x(); }
    double y_min() const { return -0.5 * width_y(); }
    bool extruded() const { return symmetry == Symmetry::extruded; }
    bool revolved() const { return symmetry == Symmetry::revolved; }
    /// Whether the front is a contour in the plane y = 0, made of straight segments.
    bool planar_contour() const { return symmetry != Symmetry::full; }
    /// Measure of the open wafer surface in one period [nm^2]; in extruded per nm of depth [nm].
    double base_area() const {
        if (revolved()) return 3.14159265358979323846 * width_x() * width_x();
        return extruded() ? width_x() : width_x() * width_y();
    }

    Vec3 node(int i, int j, int k) const {
        const double y = planar_contour() ? 0.0 : y_min() + (j + 0.5) * spacing;
        return {x_min() + (i + 0.5) * spacing, y, (k + 0.5) * spacing};
    }
};

} // namespace rille::geometry
