// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/metrics.hpp"

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <vector>

namespace rille::engine {

/// What one run of a case on one grid has measured.
struct GridRun {
    int cells = 0;        ///< across the pitch
    double spacing = 0;   ///< [nm]
    int ions = 0;         ///< followed per species
    bool is_main = false; ///< run with all its outputs, not only to be compared
    std::string failure;  ///< why there are no metrics
    std::vector<Metric> metrics;
    double wall_seconds = 0;
};

/// A bound on the error that the grid of `own_spacing` makes in each metric, from the same case on
/// coarser grids (about twice the spacing at several offsets, and about sqrt(2) times). A line
/// through the values over the spacing gives the limit of spacing zero; the error is the distance
/// to it, or what the line falls by over the own spacing if that is more, together with twice the
/// scatter about the line (root of the sum of squares), which is taken to grow with the spacing.
/// Fills Metric::grid_error (same unit) where
/// at least four grids, the own one included if `own_counts`, have the value under the same
/// definition.
void assess_grid_error(std::vector<Metric>& own, double own_spacing, bool own_counts,
                       const std::vector<GridRun>& companions);

/// Largest error [nm] of any CD ("NAME cd"): root of the squares of sampling (95 %) and grid error;
/// infinite where a CD has no grid error. `grid` and `sampling` are the parts of the largest.
struct CdError {
    double total = 0, grid = 0, sampling = 0;
};
CdError largest_cd_error(const std::vector<Metric>&);

nlohmann::json grid_run_json(const GridRun&);
/// Throws nlohmann::json::exception for anything that grid_run_json has not written.
GridRun grid_run_from_json(const nlohmann::json&);

} // namespace rille::engine
