// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/front.hpp"

#include <vector>

namespace rille::geometry {

/// A closed void in the solid (pinch-off) or a piece of solid cut off from the rest.
struct IsolatedPart {
    enum class Kind { closed_void, detached_solid };
    Kind kind = Kind::closed_void;
    Vec3 centre;       ///< [nm]; revolved: of a ring x is its mean distance from the axis
    double volume = 0; ///< [nm^3]; in extruded per nm of depth
    int chain = -1;    ///< its number in Surface::chain
};

/// Parts of the front that are not connected with the one open to the source.
std::vector<IsolatedPart> find_isolated_parts(const Front&, const Surface&);

} // namespace rille::geometry
