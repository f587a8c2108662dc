// SPDX-License-Identifier: Apache-2.0
#include "engine/csv_rows.hpp"
#include "engine/measured.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

constexpr double normal_95 = 1.959964; // two-sided 95 % point of the normal distribution

using Points = std::vector<std::array<double, 2>>;

/// A name of the table that must be one of those known.
bool is_known(const CsvCell& cell, const std::vector<std::string>& known, const char* what,
              Problems& problems) {
    if (std::find(known.begin(), known.end(), cell.text) != known.end()) return true;
    problems.add(cell.at, "",
                 fmt::format("no {} is called {}; there are: {}{}", what, quoted(cell.text),
                             listed(known, 8), did_you_mean(cell.text, known)));
    return false;
}

std::vector<MeasuredCd> cd_table_of(const CsvRows& csv, const std::vector<std::string>& features,
                                    const std::vector<std::string>& places, Problems& problems) {
    std::vector<std::string> names = {"cd", "mean_nm", "sigma_nm", "sites"};
    const bool by_feature =
        !csv.rows.empty() && !csv.rows[0].empty() && csv.rows[0][0].text == "feature";
    if (by_feature || features.size() > 1) names.insert(names.begin(), "feature");
    std::vector<std::string> written;
    if (!csv.rows.empty())
        for (const CsvCell& cell : csv.rows[0])
            written.push_back(cell.text);
    if (written != names) {
        problems.add(csv.rows.empty() ? Location{csv.name, 0, 0} : csv.rows[0][0].at, "",
                     fmt::format("the first row must name the columns {}", listed(names)));
        return {};
    }
    std::vector<MeasuredCd> table;
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        const CsvRow& row = csv.rows[r];
        if (row.size() != names.size()) {
            problems.add(row[0].at, "",
                         fmt::format("{} values in a row of {}", row.size(), names.size()));
            continue;
        }
        const std::size_t skip = names.size() - 4;
        MeasuredCd cd;
        cd.feature = skip ? row[0].text : features.empty() ? "" : features[0];
        cd.place = row[skip].text;
        if (skip) is_known(row[0], features, "opening", problems);
        is_known(row[skip], places, "height of measure.cd", problems);
        cd.mean_nm = csv_number(row[skip + 1], false, problems);
        cd.sigma_nm = csv_number(row[skip + 2], false, problems);
        const double sites = csv_number(row[skip + 3], false, problems);
        if (sites < 1 || sites != std::floor(sites) || sites > 1e9)
            problems.add(row[skip + 3].at, "",
                         fmt::format("{}: a whole number of sites from 1 is due",
                                     quoted(row[skip + 3].text)));
        else
            cd.sites = static_cast<int>(sites);
        table.push_back(cd);
    }
    return table;
}

} // namespace

std::array<double, 2> placed(const ContourFrame& frame, double x, double y, bool in_pixels) {
    const double scale = in_pixels ? frame.nm_per_px.value_or(1) : 1, up = in_pixels ? -1 : 1;
    const double across = scale * (x - frame.origin[0]);
    const double height = up * scale * (y - frame.origin[1]);
    if (frame.rotation_deg == 0) return {frame.axis_x + across, height};
    const double turn = frame.rotation_deg * M_PI / 180;
    return {frame.axis_x + across * std::cos(turn) - height * std::sin(turn),
            across * std::sin(turn) + height * std::cos(turn)};
}

Points contour_points(const CsvRows& csv, const ContourFrame& frame, Problems& problems) {
    const std::size_t before = problems.size();
    const bool in_pixels =
        !csv.rows.empty() && !csv.rows[0].empty() && csv.rows[0][0].text == "x_px";
    const std::vector<std::string> names =
        in_pixels ? std::vector<std::string>{"x_px", "y_px"}
                  : std::vector<std::string>{frame.revolved ? "r_nm" : "x_nm", "z_nm"};
    const auto columns = csv_columns(csv, names, problems);
    if (in_pixels && !frame.nm_per_px)
        problems.add(csv.rows[0][0].at, "",
                     fmt::format("the points are in pixels: {}.scale is due, for example 0.82 "
                                 "nm/px",
                                 frame.key));
    if (!in_pixels && frame.nm_per_px && problems.size() == before)
        problems.add(csv.rows[0][0].at, "",
                     fmt::format("the points are in nm: leave {}.scale out", frame.key));
    if (problems.size() != before) return {};
    if (columns[0].size() < 2) {
        problems.add({csv.name, 0, 0}, "", "holds fewer than two points");
        return {};
    }
    Points points;
    for (std::size_t i = 0; i < columns[0].size(); ++i)
        points.push_back(placed(frame, columns[0][i], columns[1][i], in_pixels));
    return points;
}

double MeasuredCd::error() const {
    return normal_95 * sigma_nm / std::sqrt(static_cast<double>(sites));
}

Points parse_contour(const std::string& text, const std::string& name, const ContourFrame& frame,
                     Problems& problems) {
    return contour_points(split_csv(text, name), frame, problems);
}

Points read_contour(const std::string& path, const ContourFrame& frame, Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, path, problems);
    return problems.size() == before ? contour_points(csv, frame, problems) : Points{};
}

std::vector<MeasuredCd> parse_cd_table(const std::string& text, const std::string& name,
                                       const std::vector<std::string>& features,
                                       const std::vector<std::string>& places, Problems& problems) {
    return cd_table_of(split_csv(text, name), features, places, problems);
}

std::vector<MeasuredCd> read_cd_table(const std::string& path,
                                      const std::vector<std::string>& features,
                                      const std::vector<std::string>& places, Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, path, problems);
    return problems.size() == before ? cd_table_of(csv, features, places, problems)
                                     : std::vector<MeasuredCd>{};
}

} // namespace rille::engine
