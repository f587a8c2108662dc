// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_measured.hpp"

#include "engine/csv_rows.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <filesystem>
#include <map>

namespace rille::engine {
namespace {

/// Columns of measured.csv that a curve needs.
constexpr std::size_t line_column = 0, point_column = 1, value_column = 2, sigma_column = 3,
                      sites_column = 4, columns_due = 5;

std::optional<double> number_of(const CsvCell& cell) {
    Problems problems;
    const double value = csv_number(cell, true, problems);
    return problems.empty() ? std::optional(value) : std::nullopt;
}

} // namespace

MeasuredRows measured_rows(const StudyView& view) {
    if (!view.y || !view.manifest.is_object()) return {};
    if (!view.manifest.value("comparison", nlohmann::json()).is_object()) return {};
    const std::string file = study_names::measured;
    Problems problems;
    const CsvRows csv =
        read_csv((std::filesystem::path(view.table.folder) / file).string(), file, problems);
    if (!problems.empty() || csv.rows.empty())
        return {{}, 0, file + " cannot be read; rille study writes it"};
    std::map<std::string, std::size_t> row_of;
    for (std::size_t row = 0; row < view.table.rows(); ++row)
        row_of.emplace(view.point(row), row);
    MeasuredRows found;
    found.unmatched = static_cast<std::size_t>(
        std::count_if(csv.header.begin(), csv.header.end(),
                      [](const auto& entry) { return entry.first == "unmatched"; }));
    std::string line;
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        const CsvRow& row = csv.rows[r];
        if (row.size() < columns_due - 2) continue;
        const auto value = number_of(row[value_column]);
        const auto point = row_of.find(row[point_column].text);
        if (!value || point == row_of.end()) continue;
        if (found.rows.empty() || row[line_column].text != line) {
            MeasuredRow measured;
            measured.value = *value;
            if (row.size() > sigma_column) measured.sigma = number_of(row[sigma_column]);
            if (row.size() > sites_column) measured.sites = number_of(row[sites_column]);
            found.rows.push_back(std::move(measured));
            line = row[line_column].text;
        }
        found.rows.back().rows.push_back(point->second);
    }
    return found;
}

} // namespace rille::engine
