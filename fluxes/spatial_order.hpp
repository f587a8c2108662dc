// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

/// Elements of a surface in an order in which runs of any length lie close together: along the
/// contour, or by interleaved binary digits of their centres in full. Equal places keep the order
/// of the elements.
/// Source: Morton (1966) [citation from memory].
std::vector<int> spatial_order(const geometry::Surface&);

} // namespace rille::fluxes
