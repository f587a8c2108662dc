// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/rates.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::engine {

/// Errors of displacement [nm, recession positive; one per element] after `time` [s] of a contour's
/// motion at these rates. A dent tilts the surface beside it, which etches at another rate R(psi):
/// to first order it moves along the contour with -dR/dpsi, down a wall that straight ions graze.
/// Values stop at corners (normals more than 30 degrees apart) and at the ends of chains.
void drift_along_contour(const geometry::Surface&, const geometry::NormalRates&, double time,
                         std::vector<std::vector<double>>& errors);

} // namespace rille::engine
