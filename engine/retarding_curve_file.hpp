// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// What a retarding-field analyser saw: shares of the ion flux in bins of energy at the wafer.
///
/// The collector current falls by the flux of the ions that the grid turns back, so -dI/dV is the
/// flux per energy as it stands: no factor of velocity belongs to it (derived).
struct RetardingSpectrum {
    std::vector<double> energy_edges_ev;
    std::vector<double> share; ///< one per bin, sum 1
    double dropped = 0; ///< part of the slope's area that was negative (noise) and was set to 0
    std::vector<std::string> warnings;
};

/// Reads a CSV with the columns voltage_V and current_A (voltages strictly increasing, at least 8
/// rows). The slope at each point is that of a parabola fitted to the points within
/// `smoothing_v` on either side. `shift_ev` is added to the retarding energy: the part of the fall
/// that the analyser's reference does not see. Every problem names line and column.
std::optional<RetardingSpectrum> read_retarding_curve(const std::string& path,
                                                      const std::string& shown, double smoothing_v,
                                                      double shift_ev, Problems&);
std::optional<RetardingSpectrum> parse_retarding_curve(const std::string& text,
                                                       const std::string& shown, double smoothing_v,
                                                       double shift_ev, Problems&);

} // namespace rille::engine
