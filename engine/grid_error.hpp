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
    /// By how much [cells, 0 to 0.5] the edges of openings lie elsewhere between its nodes than on
    /// the grid that it is compared with; not kept.
    double edge_offset = 0.5;
};

/// A bound on the error that the grid of `own_spacing` makes in each metric, from the same case on
/// coarser grids: four of about twice the spacing, on which the edges of openings lie differently
/// between the nodes, and one of about sqrt(2) times. Each tells the own error if errors go with
/// the spacing: (own - value) own_spacing / (spacing - own_spacing). The bound is the largest of
/// these from grids with the edges where the own grid has them and of the mean of the coarse ones,
/// and twice the standard deviation of those, brought down to the own spacing (root of the sum of
/// squares). Where the own grid has no value (`own_counts` false) or too few grids are that coarse,
/// it is what a line through all values falls by over the own spacing, together with twice the
/// scatter about it. The error of the widest CD is at least the least of the CDs at given heights:
/// a largest value clings to the edge of the mask on all grids.
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
