// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// A measured quantity. `value` is empty where the quantity does not exist (no wall at that height,
/// no mask left); `note` then says why.
struct Metric {
    std::string name;    ///< "depth centre", "bottom cd", "stop loss"
    std::string feature; ///< the opening's name
    std::optional<double> value;
    std::string unit;          ///< nm, deg, 1
    double sampling_error = 0; ///< 95 %, same unit; 0 where nothing is sampled
    std::string definition;
    std::string note;
    std::optional<double> grid_error = {}; ///< bound, same unit; empty where it was not assessed

    /// What both errors make together: the root of the sum of their squares.
    double error() const;
};

/// Everything measured at the end of a recipe step.
struct StepMetrics {
    std::string step;
    double time_s = 0; ///< since the start of the run
    std::vector<Metric> metrics;
};

} // namespace rille::engine
