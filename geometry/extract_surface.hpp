// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the contouring works on the band's arrays alone.
#pragma once

#include "geometry/band.hpp"
#include "geometry/surface.hpp"

namespace rille::geometry {

/// extract_surface of front.hpp on the band's phi and neighbours. Every cell whose sign differs
/// from a neighbour's must have its full ring of neighbours (diagonals included) in the band.
Surface extract_surface(const Band&);

Surface extract_contour(const Band&); ///< extruded, revolved
Surface extract_full(const Band&);

/// Appends one element and derives its centre, unit normal and area from its corners (see
/// surface.hpp for their order); that of a frustum if the surface is revolved. The area of a quad
/// is that of its mean plane, so the sum of area * normal over a closed rim is exact.
void add_element(Surface&, const std::array<int, 4>& corners, int chain, bool revolved = false);

} // namespace rille::geometry
