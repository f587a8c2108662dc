// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/estimate.hpp"
#include "engine/study/study.hpp"

#include <string>

namespace rille::engine {

/// What the points of a study will cost, as far as its first, middle and last point tell.
struct StudyCost {
    double seconds_per_point = 0;               ///< on `threads` threads of this machine; mean
    double least_seconds = 0, most_seconds = 0; ///< of the points that were looked at
    std::size_t judged_points = 0;
    double memory_mb = 0; ///< of one point at work
    std::size_t files_per_point = 0;
    double bytes_per_point = 0;
};
StudyCost study_cost(const Study&, int threads);
/// "estimate, from 3 of the points: about 3 min 20 s on 2 workers; 3 files and 0.1 MB a point, 120
/// files and 4 MB in all".
std::string study_cost_text(const Study&, const StudyCost&, int workers);

} // namespace rille::engine
