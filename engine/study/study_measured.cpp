// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_measured.hpp"

#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/study/study_effects.hpp"
#include "engine/study/study_names.hpp"
#include "engine/study/study_plan.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <functional>
#include <map>

namespace rille::engine {

namespace {

struct Key {
    std::string text;
    std::optional<double> number; ///< in the unit of the study's column
};

/// Column of the table with that name; throws InputError if there is none.
std::size_t column_named(const CsvRows& csv, const std::string& name) {
    for (std::size_t c = 0; !csv.rows.empty() && c < csv.rows[0].size(); ++c)
        if (csv.rows[0][c].text == name || heading_of(csv.rows[0][c].text).name == name) return c;
    throw InputError({{csv.name, 1, 1, "", fmt::format("has no column {}", quoted(name))}});
}

std::size_t column_of(const CsvRows& csv, const StudyColumn& column) {
    for (std::size_t c = 0; !csv.rows.empty() && c < csv.rows[0].size(); ++c)
        if (ends_path(heading_of(csv.rows[0][c].text).name, column.path)) return c;
    return column_named(csv, column.label);
}

/// A cell in the unit of the study's column, whatever that of the table.
Key key_of(const CsvCell& cell, const std::string& unit, const StudyColumn& column) {
    Key key{cell.text, std::nullopt};
    const NumberText read = split_number(cell_node(cell, unit).text);
    if (!read.error.empty() || column.unit.empty()) return key;
    const std::string own = read.unit.empty() ? column.unit : read.unit;
    if (own == column.unit || column.unit == "1") {
        key.number = read.value;
        return key;
    }
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d) {
        const QuantityText inside =
            parse_quantity(cell_node(cell, own).text, static_cast<Dimension>(d));
        for (const UnitDefinition& one : units_of(static_cast<Dimension>(d)))
            if (inside.error.empty() && column.unit == one.text)
                key.number = inside.value / one.factor - one.offset;
    }
    return key;
}

bool same(const Key& key, const StudyValue& value, double tolerance) {
    if (!key.number || !value.number) return key.text == value.text;
    const double size = std::max(std::abs(*key.number), std::abs(*value.number));
    return std::abs(*key.number - *value.number) <= tolerance * size;
}

std::string described(const Study& study, const std::vector<Key>& keys) {
    std::string text;
    for (std::size_t j = 0; j < keys.size(); ++j) {
        const StudyColumn& column = study.columns[study.comparison->join[j]];
        text += (j ? ", " : "") + column.label + " " +
                (keys[j].number
                     ? number_node(*keys[j].number, column.unit == "1" ? "" : column.unit, {}).text
                     : keys[j].text);
    }
    return text;
}

} // namespace

MeasuredJoin join_measured(const Study& study) {
    MeasuredJoin result;
    if (!study.comparison) return result;
    const StudyComparison& comparison = *study.comparison;
    Problems problems;
    const std::string name = std::filesystem::path(comparison.file).filename().string();
    const CsvRows csv = read_csv(comparison.file, name, problems);
    problems.throw_if_any();
    std::vector<std::size_t> join;
    for (const std::size_t column : comparison.join)
        join.push_back(column_of(csv, study.columns[column]));
    const auto optional_column = [&](const std::string& wanted) {
        return wanted.empty() ? std::nullopt : std::optional(column_named(csv, wanted));
    };
    const std::size_t value = column_named(csv, comparison.value);
    const auto sigma = optional_column(comparison.sigma), sites = optional_column(comparison.sites);
    std::vector<std::vector<Key>> keys;
    std::vector<MeasuredPoint> rows;
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        const CsvRow& row = csv.rows[r];
        if (row.size() != csv.rows[0].size()) continue;
        MeasuredPoint point;
        point.line = row[0].at.line;
        point.value = csv_number(row[value], true, problems);
        if (sigma) point.sigma = csv_number(row[*sigma], false, problems);
        if (sites) point.sites = csv_number(row[*sites], false, problems);
        rows.push_back(point);
        keys.emplace_back();
        for (std::size_t j = 0; j < join.size(); ++j)
            keys.back().push_back(key_of(row[join[j]], heading_of(csv.rows[0][join[j]].text).unit,
                                         study.columns[comparison.join[j]]));
    }
    problems.throw_if_any();
    std::vector<std::vector<std::size_t>> met(rows.size());
    for (std::size_t index = 0; index < study.points; ++index) {
        const StudyPoint point = study_point(study, index);
        for (std::size_t r = 0; r < rows.size(); ++r) {
            bool fits = true;
            for (std::size_t j = 0; fits && j < join.size(); ++j)
                fits = same(keys[r][j], point.values[comparison.join[j]], comparison.tolerance);
            if (fits) met[r].push_back(index);
        }
    }
    for (std::size_t r = 0; r < rows.size(); ++r) {
        for (const std::size_t index : met[r]) {
            rows[r].point = index;
            result.rows.push_back(rows[r]);
        }
        if (met[r].empty())
            result.unmatched.push_back(fmt::format("{}:{}: no point with {}", name, rows[r].line,
                                                   described(study, keys[r])));
    }
    return result;
}

std::string measured_csv(const Study& study, const StudyTable& table) {
    const MeasuredJoin join = join_measured(study);
    const auto y = answer_columns(table, study).y;
    const auto error = y ? table.error_of(*y) : std::nullopt;
    const auto name = table.find(StudyTableColumn::Role::point);
    std::map<std::string, std::size_t, std::less<>> row_of;
    for (std::size_t row = 0; name && row < table.rows(); ++row)
        row_of.emplace(table.text(row, *name), row);
    const auto cell = [](const std::optional<double>& value) {
        return value ? shortest(*value) : std::string();
    };
    std::string text = "# " + study.title + "\n# difference: predicted less measured\n";
    for (const std::string& none : join.unmatched)
        text += "# unmatched = " + none + "\n";
    text += "line,point,measured,sigma,sites,predicted,predicted_error,difference\n";
    for (const MeasuredPoint& row : join.rows) {
        const std::string point = point_name(study, row.point);
        const auto at = row_of.find(point);
        const bool known = y && at != row_of.end();
        const auto predicted = known ? table.number(at->second, *y) : std::nullopt;
        text += fmt::format("{},{},{},{},{},{},{},{}\n", row.line, point, shortest(row.value),
                            cell(row.sigma), cell(row.sites), cell(predicted),
                            known && error ? cell(table.number(at->second, *error)) : "",
                            predicted ? shortest(*predicted - row.value) : "");
    }
    return text;
}

void write_measured(const std::string& folder, const Study& study) {
    if (!study.comparison) return;
    OutputFolder(folder, OutputFolder::Existing::keep)
        .write(study_names::measured, measured_csv(study, read_study_table(folder)));
}

} // namespace rille::engine
