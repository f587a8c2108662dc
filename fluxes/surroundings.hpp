// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: averages in full.
#pragma once

#include "fluxes/arc_average.hpp"

namespace rille::fluxes {

/// Elements that share a corner, twice over, within the corner angle, and their images in mirror
/// sides.
ArcAverage average_over_surroundings(const geometry::Domain&, const geometry::Surface&);

} // namespace rille::fluxes
