// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"
#include "fluxes/waveform.hpp"

#include <optional>
#include <string>

namespace rille::engine {

/// Reads one period of a voltage from a CSV with the columns time_us and voltage_V: times strictly
/// increasing, the last value equal to the first within 1e-6 of the swing. Joined by straight lines
/// and sampled evenly. Every problem names line and column.
std::optional<fluxes::Waveform> read_waveform(const std::string& path, const std::string& shown,
                                              Problems&);
std::optional<fluxes::Waveform> parse_waveform(const std::string& text, const std::string& shown,
                                               Problems&);

} // namespace rille::engine
