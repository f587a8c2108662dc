// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "engine/surface_flux.hpp"

namespace rille::engine {

/// The part of a case's period that is computed: half or a quarter of it where mirror sides, mask
/// and ions are the same on both sides of the period's middle, else the case itself. Its `fold`
/// tells how it lies in the whole. A shape that is symmetric stays so: what noise makes of it on
/// one side it makes on the other too.
Case symmetric_part(const Case& whole);

/// "half of the period", "a quarter of the period", or "the whole period".
std::string computed_share(const geometry::Fold&);

/// What was found on a part, on the whole surface: every element has the values of the one that it
/// mirrors.
SurfaceState unfolded(const Case& part, const SurfaceState&);
SurfaceFlux unfolded(const Case& part, const SurfaceFlux&);

} // namespace rille::engine
