// SPDX-License-Identifier: Apache-2.0
#include "engine/retarding_curve_file.hpp"

#include "engine/csv_rows.hpp"
#include "engine/words.hpp"

#include <Eigen/Dense>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

constexpr std::size_t least_points = 8;

/// Slope at point `i` of the parabola through its neighbours within `reach`, at least two of them
/// on either side where there are as many (a Savitzky-Golay filter for uneven steps).
double slope_at(const std::vector<double>& x, const std::vector<double>& y, std::size_t i,
                double reach) {
    std::size_t low = i, high = i;
    while (low > 0 && (x[i] - x[low - 1] <= reach || i - low < 2))
        --low;
    while (high + 1 < x.size() && (x[high + 1] - x[i] <= reach || high - i < 2))
        ++high;
    const auto count = static_cast<Eigen::Index>(high - low + 1);
    Eigen::MatrixXd powers(count, 3);
    Eigen::VectorXd value(count);
    for (Eigen::Index k = 0; k < count; ++k) {
        const double d = (x[low + k] - x[i]) / reach;
        powers.row(k) << 1, d, d * d;
        value[k] = y[low + k];
    }
    return powers.colPivHouseholderQr().solve(value)[1] / reach;
}

bool rises(const CsvRows& csv, const std::vector<double>& voltage, Problems& problems) {
    for (std::size_t i = 1; i < voltage.size(); ++i)
        if (!(voltage[i] > voltage[i - 1])) {
            const CsvCell& cell = csv.rows[i + 1][0];
            problems.add(cell.at, "",
                         fmt::format("{} does not exceed the voltage {:.12g} before it",
                                     quoted(cell.text), voltage[i - 1]));
            return false;
        }
    return true;
}

/// Trapezoids between the points; what lies below energy 0 cannot reach the wafer.
void fill_bins(const std::vector<double>& voltage, const std::vector<double>& density,
               double shift_ev, RetardingSpectrum& spectrum) {
    double positive = 0, negative = 0;
    for (std::size_t i = 0; i + 1 < voltage.size(); ++i) {
        const double width = voltage[i + 1] - voltage[i];
        const double area = 0.5 * (density[i] + density[i + 1]) * width;
        (area > 0 ? positive : negative) += std::abs(area);
        if (voltage[i] + shift_ev < 0) continue;
        if (spectrum.energy_edges_ev.empty())
            spectrum.energy_edges_ev.push_back(voltage[i] + shift_ev);
        spectrum.energy_edges_ev.push_back(voltage[i + 1] + shift_ev);
        spectrum.share.push_back(std::max(0.0, area));
    }
    spectrum.dropped = positive > 0 ? negative / (positive + negative) : 1;
}

std::optional<RetardingSpectrum> spectrum_of(const CsvRows& csv, double smoothing_v,
                                             double shift_ev, Problems& problems) {
    const std::size_t before = problems.size();
    const auto columns = csv_columns(csv, {"voltage_V", "current_A"}, problems);
    if (problems.size() != before) return std::nullopt;
    const std::vector<double>&voltage = columns[0], &current = columns[1];
    if (voltage.size() < least_points) {
        problems.add(
            {csv.name, 0, 0}, "",
            fmt::format("holds {} points; at least {} are due", voltage.size(), least_points));
        return std::nullopt;
    }
    if (!rises(csv, voltage, problems)) return std::nullopt;
    std::vector<double> density;
    for (std::size_t i = 0; i < voltage.size(); ++i)
        density.push_back(-slope_at(voltage, current, i, smoothing_v));
    RetardingSpectrum spectrum;
    fill_bins(voltage, density, shift_ev, spectrum);
    double sum = 0;
    for (const double share : spectrum.share)
        sum += share;
    if (!(sum > 0)) {
        problems.add({csv.name, 0, 0}, "",
                     "the current does not fall with the voltage: there are no ions in this curve");
        return std::nullopt;
    }
    for (double& share : spectrum.share)
        share /= sum;
    if (spectrum.dropped > 0.01)
        spectrum.warnings.push_back(fmt::format(
            "{}: {:.3g} % of the slope is negative (noise) and was set to 0; more smoothing may be "
            "due",
            csv.name, 100 * spectrum.dropped));
    if (spectrum.share.back() > 0.01)
        spectrum.warnings.push_back(fmt::format(
            "{}: {:.3g} % of the ions sit in the last interval; does the sweep end too early?",
            csv.name, 100 * spectrum.share.back()));
    return spectrum;
}

} // namespace

std::optional<RetardingSpectrum> parse_retarding_curve(const std::string& text,
                                                       const std::string& shown, double smoothing_v,
                                                       double shift_ev, Problems& problems) {
    return spectrum_of(split_csv(text, shown), smoothing_v, shift_ev, problems);
}

std::optional<RetardingSpectrum> read_retarding_curve(const std::string& path,
                                                      const std::string& shown, double smoothing_v,
                                                      double shift_ev, Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, shown, problems);
    if (problems.size() != before) return std::nullopt;
    return spectrum_of(csv, smoothing_v, shift_ev, problems);
}

} // namespace rille::engine
