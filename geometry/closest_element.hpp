// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// For every cell of the band the nearest element of a surface and the nearest point on it.
struct ClosestElements {
    std::vector<int> element; ///< -1 where no element lies within reach
    std::vector<Vec3> foot;   ///< [nm]; may lie beyond a periodic side, next to its cell
};

/// Nearest point to p on element e [nm]: exact for segments; quads count as the disc of equal area
/// around their centre in their plane, which is what choosing between neighbours needs.
Vec3 nearest_point(const Surface&, bool extruded, int e, const Vec3& p);

/// Nearest point to p on element e, exact for segments, triangles and planar quads.
Vec3 exact_nearest_point(const Surface&, bool extruded, int e, const Vec3& p);

/// Nearest elements for all cells, `moved` [nm] along -normal from where `surface` has them (empty:
/// not moved). Of elements equally near (at a corner), the one that faces the cell most wins, then the
/// more level one, so that mirrored shapes get mirrored choices.
ClosestElements closest_elements(const Band&, const Surface&, const std::vector<double>& moved);

} // namespace rille::geometry
