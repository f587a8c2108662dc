// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;
struct Metric;

/// Measured and predicted walls at one height. Absent where there is no such wall.
struct WallsAt {
    double z_nm = 0;
    struct Walls {
        double left_nm = 0, right_nm = 0; ///< x
    };
    std::optional<Walls> measured, predicted;
    double width_error_nm = 0; ///< 95 % sampling error of the predicted width
};

/// A measured contour against the section of the front at one distance from the feature's axis.
struct ContourComparison {
    std::string feature;
    double cut_nm = 0; ///< distance of the section from the axis
    /// Root mean square, over the length of the measured contour, of the distance to the front.
    double rms_nm = 0;
    double rms_error_nm = 0;    ///< 95 % sampling error
    double largest_nm = 0;      ///< largest such distance,
    double largest_at_z_nm = 0; ///< and the height where it is
    std::vector<WallsAt> walls; ///< from the top of the contour down
};

/// A measured CD against the predicted one.
struct CdComparison {
    std::string feature, place;
    double z_nm = 0;
    double mean_nm = 0, mean_error_nm = 0; ///< with the 95 % half-width of the mean
    int sites = 0;
    std::optional<double> predicted_nm;
    double predicted_error_nm = 0; ///< 95 % sampling error
};

struct Comparison {
    /// One for each end of the stated range of cuts.
    std::vector<ContourComparison> contours;
    std::vector<CdComparison> cds;
};

/// The front against what the case names as measured; empty where it names nothing.
Comparison compare_measured(const Case&, const SurfaceState&);

/// "contour rms", with the cut where there are several.
std::string contour_metric(double cut_nm, bool several);
/// As metrics: "contour rms", "NAME cd difference" (predicted less measured).
std::vector<Metric> comparison_metrics(const Comparison&);
/// comparison.csv: one row a cut and height.
std::string comparison_csv(const Case&, const Comparison&);
nlohmann::json comparison_json(const Comparison&);

} // namespace rille::engine
