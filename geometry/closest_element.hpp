// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// An element where it has moved to, side by side in memory: elements are asked for in no order.
struct alignas(64) Plate {
    Vec3 centre, normal; ///< [nm]; unit
    double radius;       ///< [nm] of the disc that stands for a quad; half a segment's length
};

/// Nearest point of an element to p [nm], next to p in a periodic domain.
Vec3 nearest_point(const Domain&, const Plate&, const Vec3& p);

/// For every cell of a band the nearest element of a surface.
struct ClosestElements {
    RawVector<Plate> plates;
    RawVector<int> element; ///< -1 where no element lies within reach
};

/// Nearest point to p on element e, exact for segments, triangles and planar quads.
Vec3 exact_nearest_point(const Surface&, bool planar, int e, const Vec3& p);

/// Nearest elements for all cells, `moved` [nm] along -normal from where `surface` has them (empty:
/// not moved). Of elements equally near (at a corner), the one that faces the cell most wins, then
/// the more level one, so that mirrored shapes get mirrored choices.
ClosestElements closest_elements(const Band&, const Surface&, const std::vector<double>& moved);

} // namespace rille::geometry
