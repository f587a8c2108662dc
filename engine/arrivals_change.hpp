// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/surface_step.hpp"
#include "geometry/between_centres.hpp"
#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::engine {

/// How much the arrivals changed between two surfaces, as the change of the rate that they make of
/// the same material at the same normal, relative to the typical rate: half of all that is
/// removed or grown sees a larger change. So a corner that appears or goes, where averages over the
/// surface jump, does not count; nor does what may be sampling noise (three standard errors).
/// `feet[e]` is where element e of `surface` ends on the later surface.
double arrivals_change(const geometry::Domain&, const geometry::Surface& surface,
                       const fluxes::SurfaceStep& now, const fluxes::SurfaceStep& later,
                       const std::vector<geometry::BetweenCentres>& feet);

} // namespace rille::engine
