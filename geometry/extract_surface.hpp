// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the contouring works on the band's arrays alone.
#pragma once

#include "geometry/band.hpp"
#include "geometry/surface.hpp"

namespace rille::geometry {

/// Where full surfaces get sharp edges. drawn: wherever the band may have one, for an exact shape.
/// etched: where flat faces of some extent surely meet. An etched front is rough by fractions of a
/// cell, and vertices moved to edges that are not there feed back on its shape.
enum class Edges { drawn, etched };

/// extract_surface of front.hpp on the band's phi and neighbours. Every cell whose sign differs
/// from a neighbour's must have its full ring of neighbours (diagonals included) in the band.
Surface extract_surface(const Band&, Edges = Edges::drawn);

Surface extract_extruded(const Band&);
Surface extract_full(const Band&, Edges);

/// Appends one element and derives its centre, unit normal and area from its corners (see
/// surface.hpp for their order). The area of a quad is that of its mean plane, so the sum of
/// area * normal over a closed rim is exact.
void add_element(Surface&, const std::array<int, 4>& corners, int chain);

} // namespace rille::geometry
