// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"

namespace rille::geometry {

/// Change of phi [nm] from an outermost node to the mirror side, or the axis, half a cell further
/// out along `axis` (0 = x, 1 = y). Where phi is smooth and even about the side: third order. Where
/// its slope stays the same inwards and is more than 0.06, 3.4 degrees, so that the surface and its
/// image meet in an edge: exact for linear phi. The third order would take in noise from a third
/// node.
double change_to_side(const Band&, int node, int axis, bool low);

} // namespace rille::geometry
