// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"

#include <nlohmann/json_fwd.hpp>
#include <string>

namespace rille::engine {

/// What a run will cost, before it is started.
struct Estimate {
    std::string computed;     ///< what of the period is computed, mirrored to the rest
    std::size_t elements = 0; ///< of the surface that is computed, at the expected end
    std::size_t voxels = 0;   ///< of its narrow band at the expected end
    double memory_mb = 0;
    int refreshes = 0;                 ///< of the arrivals, two for each advance
    double process_s = 0;              ///< simulated time
    double wall_seconds = 0;           ///< one refresh of the initial front, scaled
    std::vector<std::string> warnings; ///< of charging
};

/// Builds the initial front, does one short advance and scales its cost to the expected end. The
/// depth is the open field's, so what only happens inside a feature (a slower floor, a microtrench)
/// is not in it.
Estimate estimate_run(const Case&);
/// Lines of a YAML comment, so that they can stand below the case and the whole is still a case.
std::string estimate_text(const Case&, const Estimate&);
nlohmann::json estimate_json(const Case&, const Estimate&);

} // namespace rille::engine
