// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;

/// What is read off one feature at one instant. Lengths in nm; nothing where it does not exist.
struct FeatureRow {
    std::optional<double> depth_centre; ///< below the mask bottom, on the axis
    std::optional<double> depth_deepest;
    std::vector<std::optional<double>> cd; ///< in the order of Case::cd_places
    std::optional<double> mask_left;
};

/// One refresh of the arrivals and the advance that used it.
struct HistoryRow {
    double time_s = 0;      ///< since the start of the run, at the end of this advance
    std::string step;       ///< recipe step
    double step_time_s = 0; ///< since the start of the recipe step
    double time_step_s = 0;
    int sub_steps = 0;
    std::vector<FeatureRow> features; ///< per opening of the mask
    double highest_rate = 0;          ///< [nm/s] fastest etching on the front
    double lowest_rate = 0;           ///< [nm/s] slowest, < 0 where a film grows
    int elements = 0;
    int iterations = 0;          ///< of transport and kinetics
    double residual = 0;         ///< largest change of a sticking probability in the last iteration
    double largest_move = 0;     ///< [cells]
    double redistance_shift = 0; ///< [cells] largest so far
    std::uint64_t rays = 0;      ///< traced so far
    std::uint64_t lost_rays = 0; ///< lost so far
};

/// What the columns of an opening (index into Case::mask.openings) begin with.
std::string history_name(const Case&, std::size_t opening);

/// history.csv: one line a row, every column's unit at the end of its name (`_1` = dimensionless).
std::string history_csv(const Case&, const std::vector<HistoryRow>&);

} // namespace rille::engine
