// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

#include <array>
#include <cstddef>
#include <vector>

namespace rille::geometry {

/// The front as a set of elements, taken from the sub-cell zero contour: exactly one period.
///
/// extruded: an element is a straight segment in the plane y = 0. corners = {a, b, -1, -1}; walking
/// from a to b the gas lies on the left, so a flat open surface runs from -x to +x. Elements of one
/// chain are stored in walking order and joined through `next` and `previous` (-1 at a mirror
/// side; in a periodic domain the chain continues on the other side of the period).
/// revolved: the same contour in the half-plane y = 0, x >= 0; an element is the frustum that its
/// segment sweeps about the axis x = 0. Chains end (-1) on the axis as they do at a mirror side.
/// full: an element is a planar or bilinear quad {a, b, c, d}, anticlockwise seen from the gas;
/// a triangle has d == c. `next` and `previous` are empty.
struct Surface {
    std::vector<Vec3> vertices;              ///< [nm]
    std::vector<std::array<int, 4>> corners; ///< indices into `vertices`
    std::vector<Vec3> centre;                ///< mean of the corners [nm]; of the segment
    std::vector<Vec3> normal;                ///< unit, out of the solid
    std::vector<double> area;  ///< [nm^2]; extruded: per nm of depth, i.e. length; revolved: of the
                               ///< whole frustum, pi (r1 + r2) length
    std::vector<int> next;     ///< of a contour: element that starts where this ends
    std::vector<int> previous; ///< of a contour: element that ends where this starts
    std::vector<int> chain;    ///< connected part; 0 is the part open to the source

    std::size_t size() const { return corners.size(); }
    /// Length of the segment that is element e of a contour [nm].
    double length(int e) const {
        return (vertices[corners[e][1]] - vertices[corners[e][0]]).length();
    }
};

} // namespace rille::geometry
