// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/front.hpp"
#include "geometry/initial_shape.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// Planes about which a whole period is its own mirror image, so that one side of each tells all:
/// the half x <= 0, the half y <= 0 or the quarter of both. That part is a period of its own with
/// mirror sides and, as every period, centred on its own origin.
struct Fold {
    bool x = false, y = false;

    bool any() const { return x || y; }
    /// How many times the part is in the whole: 1, 2 or 4.
    int copies() const { return (x ? 2 : 1) * (y ? 2 : 1); }
    /// The domain of the part. Needs an even number of cells along the folded axes.
    Domain part(const Domain& whole) const;
    Domain whole(const Domain& part) const;
    /// Where the origin of the part lies in the whole [nm].
    Vec3 origin(const Domain& part) const;
    /// The mirror image number `copy` (0 to copies() - 1; 0 = itself) of a point of the whole, or
    /// of a direction.
    Vec3 image(int copy, Vec3 v) const;
};

/// The planes about which the openings of the mask mirror each other in this domain, within 1e-9
/// of the period: none unless its sides are mirrors and its cells come in pairs.
Fold symmetry_planes(const Domain&, const MaskShape&);

/// The surface of the whole, and for each of its elements that element of the part which it is or
/// mirrors. Elements on either side of a plane are joined there.
struct Unfolded {
    Surface surface;
    std::vector<int> source;
};
Unfolded unfold(const Fold&, const Domain& part, const Surface&);

/// The level set of the whole, node by node.
Front unfold(const Fold&, const Front& part);

} // namespace rille::geometry
