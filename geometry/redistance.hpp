// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/closest_element.hpp"
#include "geometry/surface.hpp"

namespace rille::geometry {

/// Largest movement of the contour that redistancing may cause [cells].
constexpr double redistance_limit = 1e-3;

/// Gives cells within 1.5 cells of the contour whose |grad phi| is off 1 by more than 0.2 on all
/// sides their exact distance to `surface`, which must be the present contour. Kinks of a true
/// distance are left alone. Cells next to the contour change only where no crossing shifts by more
/// than redistance_limit. Returns the largest shift of a crossing [cells].
double redistance(Band&, const Surface& surface, const ClosestElements&);

} // namespace rille::geometry
