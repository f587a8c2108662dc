// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_cost.hpp"

#include "engine/console.hpp"
#include "engine/study/point_run.hpp"
#include "engine/study/study_plan.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <set>
#include <tbb/global_control.h>

namespace rille::engine {
namespace {

// Sizes as the poly-trench example leaves them, which are within a factor of two elsewhere.
constexpr double record_bytes = 2e3, metrics_bytes = 8e3, case_bytes = 4e3, picture_bytes = 1.3e6;
constexpr double profile_bytes_per_element = 500, frame_bytes_per_element = 900;
constexpr double history_bytes_per_refresh = 250, grid_bytes_per_voxel = 6;
constexpr std::size_t frames_a_run = 11;

std::string size_text(double bytes) {
    if (bytes < 1e6) return fmt::format("{:.0f} kB", bytes / 1e3);
    if (bytes < 1e9) return fmt::format("{:.1f} MB", bytes / 1e6);
    return fmt::format("{:.1f} GB", bytes / 1e9);
}

/// Means over a few points and the largest memory: of the first and the last point, which are
/// opposite corners of a grid, and one between them.
Estimate estimate_points(const Study& study, StudyCost& cost) {
    Estimate sum;
    std::set<std::size_t> chosen = {0, study.points / 2, study.points - 1};
    for (const std::size_t index : chosen) {
        Problems problems;
        const BuiltCase built = build_point(study, index, true, problems);
        problems.throw_if_any();
        const Estimate one = estimate_run(built.result);
        const double share = 1 / static_cast<double>(chosen.size());
        cost.least_seconds = cost.judged_points == 0
                                 ? one.wall_seconds
                                 : std::min(cost.least_seconds, one.wall_seconds);
        cost.most_seconds = std::max(cost.most_seconds, one.wall_seconds);
        ++cost.judged_points;
        sum.wall_seconds += share * one.wall_seconds;
        sum.memory_mb = std::max(sum.memory_mb, one.memory_mb);
        sum.elements = std::max(sum.elements, one.elements);
        sum.voxels = std::max(sum.voxels, one.voxels);
        sum.refreshes = std::max(sum.refreshes, one.refreshes);
    }
    return sum;
}

} // namespace

StudyCost study_cost(const Study& study, int threads) {
    const tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
    StudyCost cost;
    const Estimate estimate = estimate_points(study, cost);
    const RunParts parts = run_parts(study.keep.each);
    const auto elements = static_cast<double>(estimate.elements);
    cost.seconds_per_point = estimate.wall_seconds;
    cost.memory_mb = estimate.memory_mb;
    const auto leave = [&](bool is_left, std::size_t files, double bytes) {
        if (!is_left) return;
        cost.files_per_point += files;
        cost.bytes_per_point += bytes;
    };
    leave(true, 2, record_bytes + metrics_bytes);
    leave(parts.profile, 1, profile_bytes_per_element * elements);
    leave(parts.pictures, 7, picture_bytes);
    leave(parts.history, 1, history_bytes_per_refresh * estimate.refreshes);
    leave(parts.frames, frames_a_run + 1, frames_a_run * frame_bytes_per_element * elements);
    leave(parts.resolved_case, 1 + study.base.inputs.size(), case_bytes);
    leave(parts.level_set, 1, grid_bytes_per_voxel * static_cast<double>(estimate.voxels));
    leave(parts.record, 1, case_bytes);
    return cost;
}

std::string study_cost_text(const Study& study, const StudyCost& cost, int workers) {
    const double rounds = std::ceil(static_cast<double>(study.points) / std::max(1, workers));
    const std::string from = cost.judged_points < 2
                                 ? ""
                                 : fmt::format(" ({} to {})", duration_text(cost.least_seconds),
                                               duration_text(cost.most_seconds));
    return fmt::format("estimate, from {} of the points: about {} a point{}, {} for {} points on "
                       "{} worker{}; {} MB of memory each\nit leaves: {} files and about {} a "
                       "point, {} files and about {} in all\n",
                       cost.judged_points, duration_text(cost.seconds_per_point), from,
                       duration_text(rounds * cost.seconds_per_point), study.points, workers,
                       workers == 1 ? "" : "s", std::ceil(cost.memory_mb), cost.files_per_point,
                       size_text(cost.bytes_per_point), study.points * cost.files_per_point,
                       size_text(static_cast<double>(study.points) * cost.bytes_per_point));
}

} // namespace rille::engine
