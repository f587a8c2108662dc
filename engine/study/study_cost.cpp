// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_cost.hpp"

#include "engine/console.hpp"
#include "engine/study/point_run.hpp"

#include <cmath>
#include <fmt/format.h>
#include <tbb/global_control.h>

namespace rille::engine {
namespace {

// Sizes as the poly-trench example leaves them, which are within a factor of two elsewhere.
constexpr double record_bytes = 2e3, metrics_bytes = 8e3, case_bytes = 4e3, picture_bytes = 2.5e5;
constexpr double profile_bytes_per_element = 500, frame_bytes_per_element = 900;
constexpr double history_bytes_per_refresh = 250, grid_bytes_per_voxel = 6;
constexpr std::size_t frames_a_run = 11;

std::string size_text(double bytes) {
    if (bytes < 1e6) return fmt::format("{:.0f} kB", bytes / 1e3);
    if (bytes < 1e9) return fmt::format("{:.1f} MB", bytes / 1e6);
    return fmt::format("{:.1f} GB", bytes / 1e9);
}

} // namespace

StudyCost study_cost(const Study& study, int threads) {
    const tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
    const Estimate estimate = estimate_run(study.base);
    const RunParts parts = run_parts(study.keep.each);
    const auto elements = static_cast<double>(estimate.elements);
    StudyCost cost;
    cost.seconds_per_point = estimate.wall_seconds;
    cost.memory_mb = estimate.memory_mb;
    const auto leave = [&](bool is_left, std::size_t files, double bytes) {
        if (!is_left) return;
        cost.files_per_point += files;
        cost.bytes_per_point += bytes;
    };
    leave(true, 2, record_bytes + metrics_bytes);
    leave(parts.profile, 1, profile_bytes_per_element * elements);
    leave(parts.pictures, 4, picture_bytes);
    leave(parts.history, 1, history_bytes_per_refresh * estimate.refreshes);
    leave(parts.frames, frames_a_run + 1, frames_a_run * frame_bytes_per_element * elements);
    leave(parts.resolved_case, 1 + study.base.inputs.size(), case_bytes);
    leave(parts.level_set, 1, grid_bytes_per_voxel * static_cast<double>(estimate.voxels));
    leave(parts.record, 1, case_bytes);
    return cost;
}

std::string study_cost_text(const Study& study, const StudyCost& cost, int workers) {
    const double rounds = std::ceil(static_cast<double>(study.points) / std::max(1, workers));
    return fmt::format("cost: about {} a point, {} for {} points on {} worker{}; {} MB of memory "
                       "each\nit leaves: {} files and about {} a point, {} files and about {} in "
                       "all\n",
                       duration_text(cost.seconds_per_point),
                       duration_text(rounds * cost.seconds_per_point), study.points, workers,
                       workers == 1 ? "" : "s", std::ceil(cost.memory_mb), cost.files_per_point,
                       size_text(cost.bytes_per_point), study.points * cost.files_per_point,
                       size_text(static_cast<double>(study.points) * cost.bytes_per_point));
}

} // namespace rille::engine
