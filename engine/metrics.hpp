// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/comparison.hpp"
#include "engine/history.hpp"
#include "engine/metric.hpp"
#include "engine/run_result.hpp"
#include "engine/units.hpp"
#include "geometry/metrology.hpp"

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;
struct Target;

enum class Verdict { met, missed, undecided };

struct TargetVerdict {
    std::string target; ///< "bottom cd: 55 nm to 65 nm", "mask left after over: at least 40 nm"
    std::string metric, feature;
    Verdict verdict = Verdict::undecided;
    /// What the numbers alone say, before the standing of the parameters is asked.
    Verdict by_numbers = Verdict::undecided;
    std::string reason;
    /// Recipe step at whose end the value stood; empty: the end of the run.
    std::string after{};
    std::optional<double> value{};
    double sampling_error = 0; ///< 95 %, in `unit`
    std::string unit{};
};

struct Metrics {
    double time_s = 0;
    /// Of the end of the recipe, and not of where a run was stopped or failed.
    bool is_final = true;
    std::vector<Metric> metrics;
    std::vector<TargetVerdict> targets;
    /// Lowest film that is open over the whole floor, and every film above it that is not: the
    /// clear/not cleared statement per feature.
    struct Clearing {
        std::string feature, film;
        bool cleared = false;
        double remaining_nm = 0; ///< largest thickness left over the floor
    };
    std::vector<Clearing> clearing;
    Comparison comparison; ///< with what was measured
    /// At the ends of the steps that targets name, in the order of the recipe, so far as the run
    /// came to them.
    std::vector<StepMetrics> after;

    bool has_grid_errors() const;
    /// The metric of that name (of that feature if given), or null.
    const Metric* find(const std::string& name, const std::string& feature = "") const;
};

/// A quantity that a case can be asked for by name.
struct MetricName {
    std::string name;
    std::optional<Dimension> dimension; ///< empty: a plain number
};
/// Every name that targets and studies may use for this case; a metric has one value per opening.
std::vector<MetricName> metric_names(const Case&);

/// The feature sites of a case: its openings.
std::vector<geometry::FeatureSite> feature_sites(const Case&);

/// Every metric that exists for the case's symmetry, with the targets judged. Definitions are in
/// the metrics themselves. `after`: what was measured at the ends of earlier steps. Targets for the
/// end of a run that has not come to it (`is_final` false) stay undecided.
Metrics measure(const Case&, const SurfaceState&, std::vector<StepMetrics> after = {},
                bool is_final = true);
/// Whether a target asks for values at the end of that recipe step.
bool is_measured_after(const Case&, const std::string& step);
/// The state at the end of a step, measured.
StepMetrics measure_after(const Case&, const SurfaceState&, const std::string& step);
/// Fills the measured columns of a history row.
void measure_row(const Case&, const geometry::Surface&, HistoryRow&);

/// 95 % sampling error of a measured quantity: w_b = sum weight * u_b[element] over its elements.
double sampling_error(const geometry::Measured&,
                      const std::vector<std::vector<double>>& displacement);

/// Judges one value with its 95 % half-width against a range.
Verdict judge(double value, double error, const Target&);
/// Judges all targets. Where parameters are illustrative or from memory the verdict is undecided,
/// and the reason names them.
std::vector<TargetVerdict> judge_targets(const Case&, const Metrics&);

const char* verdict_name(Verdict);
/// "60.1 ± 0.3", with a grid error "60.1 ± 0.3 ± 0.5": of a metric that has a value.
std::string value_text(const Metric&);
/// What stands behind ± in value_text, as a line below a table.
std::string errors_text(const Metrics&);
nlohmann::json metrics_json(const Case&, const Metrics&);
/// The table for the terminal; `colour` adds none but the verdict's own words.
std::string metrics_table(const Case&, const Metrics&);

} // namespace rille::engine
