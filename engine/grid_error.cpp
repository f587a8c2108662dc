// SPDX-License-Identifier: Apache-2.0
#include "engine/grid_error.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr std::size_t fewest_grids = 4;

constexpr double coarse = 1.6;      ///< times the own spacing, and it counts as twice
constexpr double same_place = 0.13; ///< [cells] edges of openings so near lie at the same place

struct GridValue {
    double spacing, value;
    double edge_offset = 0;
};

/// value = limit + slope spacing, by least squares with weights 1 / spacing^2: the scatter of a
/// measured length about its trend is a share of a cell.
struct Trend {
    double limit = 0, slope = 0;
    double scatter = 0; ///< standard deviation from the line over the spacing
};

Trend trend_of(const std::vector<GridValue>& values) {
    double w = 0, wh = 0, whh = 0, wx = 0, whx = 0;
    for (const auto& [h, x, offset] : values) {
        const double weight = 1 / (h * h);
        w += weight;
        wh += weight * h;
        whh += weight * h * h;
        wx += weight * x;
        whx += weight * h * x;
    }
    Trend trend;
    const double determinant = w * whh - wh * wh;
    trend.slope = (w * whx - wh * wx) / determinant;
    trend.limit = (wx - trend.slope * wh) / w;
    for (const auto& [h, x, offset] : values)
        trend.scatter += std::pow((x - trend.limit - trend.slope * h) / h, 2);
    trend.scatter = std::sqrt(trend.scatter / (values.size() - 2.0));
    return trend;
}

/// Distance of the own value to the limit of the line, and twice the scatter about it.
double by_trend(double own_spacing, const std::optional<double>& own,
                const std::vector<GridValue>& values) {
    const Trend trend = trend_of(values);
    double distance = std::fabs(trend.slope) * own_spacing;
    if (own) distance = std::max(distance, std::fabs(*own - trend.limit));
    return std::hypot(distance, 2 * trend.scatter * own_spacing);
}

/// Errors of the own value as each coarser grid tells them. Nothing with too few of them.
std::optional<double> by_extrapolation(const GridValue& own, const std::vector<GridValue>& others) {
    double largest = 0, mean = 0, square = 0, spacing = 0;
    int count = 0;
    for (const GridValue& other : others) {
        if (other.spacing < 1.2 * own.spacing) continue;
        const double error =
            (own.value - other.value) * own.spacing / (other.spacing - own.spacing);
        if (other.edge_offset <= same_place) largest = std::max(largest, std::fabs(error));
        if (other.spacing < coarse * own.spacing) continue;
        mean += error;
        square += error * error;
        spacing += other.spacing;
        ++count;
    }
    if (count < 3) return {};
    mean /= count;
    spacing /= count;
    const double deviation =
        std::sqrt(std::max(0.0, square - count * mean * mean) / (count - 1.0)) *
        (1 - own.spacing / spacing); // of values at the own spacing, not of what they tell
    return std::hypot(std::max(largest, std::fabs(mean)), 2 * deviation);
}

const Metric* same_metric(const GridRun& run, const Metric& own) {
    const auto found = std::find_if(run.metrics.begin(), run.metrics.end(), [&](const Metric& m) {
        return m.name == own.name && m.feature == own.feature && m.definition == own.definition;
    });
    return found == run.metrics.end() || !found->value ? nullptr : &*found;
}

const char* const widest = "bow cd";

bool is_cd(const std::string& name) {
    return name.size() > 3 && name.compare(name.size() - 3, 3, " cd") == 0;
}

/// Of the CDs at given heights of one feature; 0 without any.
double least_cd_error(const std::vector<Metric>& metrics, const std::string& feature) {
    std::optional<double> least;
    for (const Metric& metric : metrics)
        if (is_cd(metric.name) && metric.name != widest && metric.feature == feature &&
            metric.grid_error)
            least = std::min(least.value_or(*metric.grid_error), *metric.grid_error);
    return least.value_or(0);
}

} // namespace

void assess_grid_error(std::vector<Metric>& own, double own_spacing, bool own_counts,
                       const std::vector<GridRun>& companions) {
    for (Metric& metric : own) {
        metric.grid_error.reset();
        std::vector<GridValue> values;
        double finest = own_spacing, coarsest = own_spacing;
        for (const GridRun& run : companions)
            if (const Metric* same = same_metric(run, metric)) {
                values.push_back({run.spacing, *same->value, run.edge_offset});
                finest = std::min(finest, run.spacing);
                coarsest = std::max(coarsest, run.spacing);
            }
        const bool counts = own_counts && metric.value;
        if (values.size() + counts < fewest_grids || coarsest < 1.2 * finest) continue;
        if (counts) metric.grid_error = by_extrapolation({own_spacing, *metric.value}, values);
        if (metric.grid_error) continue;
        if (counts) values.push_back({own_spacing, *metric.value});
        metric.grid_error = by_trend(own_spacing, counts ? metric.value : std::nullopt, values);
    }
    for (Metric& metric : own)
        if (metric.name == widest && metric.grid_error)
            metric.grid_error = std::max(*metric.grid_error, least_cd_error(own, metric.feature));
}

CdError largest_cd_error(const std::vector<Metric>& metrics) {
    CdError largest;
    for (const Metric& metric : metrics) {
        if (!metric.value || !is_cd(metric.name)) continue;
        const double grid = metric.grid_error.value_or(std::numeric_limits<double>::infinity());
        const double total = std::hypot(grid, metric.sampling_error);
        if (total > largest.total) largest = {total, grid, metric.sampling_error};
    }
    return largest;
}

json grid_run_json(const GridRun& run) {
    json metrics = json::array();
    for (const Metric& m : run.metrics) {
        json entry = {{"name", m.name},
                      {"feature", m.feature},
                      {"value", nullptr},
                      {"unit", m.unit},
                      {"sampling_error", m.sampling_error},
                      {"definition", m.definition}};
        if (m.value) entry["value"] = *m.value;
        metrics.push_back(std::move(entry));
    }
    return {{"cells", run.cells},     {"spacing_nm", run.spacing},
            {"ions", run.ions},       {"is_main", run.is_main},
            {"failure", run.failure}, {"wall_seconds", run.wall_seconds},
            {"metrics", metrics}};
}

GridRun grid_run_from_json(const json& written) {
    GridRun run;
    run.cells = written.at("cells");
    run.spacing = written.at("spacing_nm");
    run.ions = written.at("ions");
    run.is_main = written.at("is_main");
    run.failure = written.at("failure");
    run.wall_seconds = written.at("wall_seconds");
    for (const json& m : written.at("metrics")) {
        Metric metric;
        metric.name = m.at("name");
        metric.feature = m.at("feature");
        if (!m.at("value").is_null()) metric.value = m.at("value").get<double>();
        metric.unit = m.at("unit");
        metric.sampling_error = m.at("sampling_error");
        metric.definition = m.at("definition");
        run.metrics.push_back(std::move(metric));
    }
    return run;
}

} // namespace rille::engine
