// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"

#include <string>

namespace rille::engine {

/// causes.csv: what each cause has removed since the start of the run [nm], for every piece of the
/// section (in extruded the whole surface), in walking order: place, part of the surface, material,
/// each cause, what none explains, their total, and what each supply brought (flux times
/// d(rate)/d(flux), summed over the run). Remark lines at its head say how to read it. `state`
/// needs `removed`.
std::string causes_csv(const Case&, const SurfaceState& state);

/// The section of the first opening, beside it both walls' removal by cause against depth, below it
/// the floor's against x.
std::string cause_picture_svg(const Case&, const SurfaceState& state);

} // namespace rille::engine
