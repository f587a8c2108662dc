// SPDX-License-Identifier: Apache-2.0
#include "engine/state_table.hpp"

#include "engine/csv_rows.hpp"
#include "engine/units.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <map>
#include <optional>
#include <utility>

namespace rille::engine {

namespace {

struct Column {
    std::string name, unit;
    Location at;
    std::vector<double> value; ///< as written
};

/// A set point: a column with the places of its values on the axis and where `at` lies.
struct Axis {
    std::vector<double> value; ///< sorted, unique
    std::size_t low = 0;       ///< interval that holds the point
    double part = 0;           ///< of the interval, 0 to 1
};

std::vector<std::string> all_units() {
    std::vector<std::string> units;
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d)
        for (const UnitDefinition& unit : units_of(static_cast<Dimension>(d)))
            units.emplace_back(unit.text);
    return units;
}

std::vector<Column> read_columns(const CsvRows& csv, Problems& problems) {
    std::vector<Column> columns;
    if (csv.rows.size() < 2) {
        problems.add({csv.name, 0, 0}, "", "holds no rows below the names of the columns");
        return columns;
    }
    const std::vector<std::string> units = all_units();
    for (const CsvCell& cell : csv.rows[0]) {
        const std::size_t open = cell.text.find('[');
        Column column;
        column.at = cell.at;
        column.name = trimmed(cell.text.substr(0, open));
        if (open != std::string::npos && cell.text.back() == ']')
            column.unit = trimmed(cell.text.substr(open + 1, cell.text.size() - open - 2));
        if (column.unit.empty())
            problems.add(cell.at, "",
                         fmt::format("{}: the column needs its unit in brackets, for example {}",
                                     quoted(cell.text), quoted("pressure [mTorr]")));
        else if (std::find(units.begin(), units.end(), column.unit) == units.end())
            problems.add(cell.at, "",
                         fmt::format("unknown unit {}{}", quoted(std::as_const(column.unit)),
                                     did_you_mean(column.unit, units)));
        columns.push_back(column);
    }
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        const CsvRow& row = csv.rows[r];
        if (row.size() != columns.size()) {
            problems.add(row[0].at, "",
                         fmt::format("{} values in a row of {}", row.size(), columns.size()));
            continue;
        }
        for (std::size_t c = 0; c < columns.size(); ++c)
            columns[c].value.push_back(csv_number(row[c], true, problems));
    }
    return columns;
}

/// The value of a set point in the unit of its column; nothing and a problem if that cannot be.
std::optional<double> in_unit_of(const Column& column, const YamlNode& point, Problems& problems) {
    std::string error;
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d)
        for (const UnitDefinition& unit : units_of(static_cast<Dimension>(d))) {
            if (column.unit != unit.text) continue;
            const QuantityText read = parse_quantity(point.text, static_cast<Dimension>(d));
            if (read.error.empty()) return read.value / unit.factor - unit.offset;
            if (error.empty()) error = read.error;
        }
    problems.add(point.at, point.path, error);
    return std::nullopt;
}

bool place(const Column& column, const YamlNode& point, Axis& axis, Problems& problems) {
    const std::optional<double> value = in_unit_of(column, point, problems);
    if (!value) return false;
    axis.value = column.value;
    std::sort(axis.value.begin(), axis.value.end());
    axis.value.erase(std::unique(axis.value.begin(), axis.value.end()), axis.value.end());
    const double slack = 1e-9 * std::abs(axis.value.back());
    if (*value < axis.value.front() - slack || *value > axis.value.back() + slack) {
        problems.add(point.at, point.path,
                     fmt::format("{} lies outside the table, which holds {:.12g} to {:.12g} {}; "
                                 "states are not extrapolated",
                                 quoted(point.text), axis.value.front(), axis.value.back(),
                                 column.unit));
        return false;
    }
    if (axis.value.size() == 1) return true;
    const auto above = std::upper_bound(axis.value.begin(), axis.value.end() - 1, *value);
    axis.low = std::max<std::ptrdiff_t>(1, above - axis.value.begin()) - 1;
    axis.part = std::clamp((*value - axis.value[axis.low]) /
                               (axis.value[axis.low + 1] - axis.value[axis.low]),
                           0.0, 1.0);
    return true;
}

/// Rows with their weights: the corners of the cell of the grid around the point.
struct Blend {
    std::vector<std::pair<std::size_t, double>> rows;
};

std::optional<Blend> blend_of(const CsvRows& csv, const std::vector<const Column*>& columns,
                              const std::vector<Axis>& axes, Problems& problems) {
    std::map<std::vector<double>, std::size_t> row_at;
    for (std::size_t r = 0; r < columns[0]->value.size(); ++r) {
        std::vector<double> key;
        for (const Column* column : columns)
            key.push_back(column->value[r]);
        if (!row_at.emplace(key, r).second) {
            problems.add(csv.rows[r + 1][0].at, "",
                         "these set points stand in an earlier row already");
            return std::nullopt;
        }
    }
    Blend blend;
    for (std::size_t corner = 0; corner < std::size_t(1) << axes.size(); ++corner) {
        double weight = 1;
        std::vector<double> key;
        std::string text;
        for (std::size_t a = 0; a < axes.size(); ++a) {
            const bool up = corner >> a & 1;
            weight *= up ? axes[a].part : 1 - axes[a].part;
            key.push_back(axes[a].value[std::min(axes[a].low + up, axes[a].value.size() - 1)]);
            text += fmt::format("{}{} {:.12g} {}", a ? ", " : "", columns[a]->name, key.back(),
                                columns[a]->unit);
        }
        if (!(weight > 0)) continue;
        const auto row = row_at.find(key);
        if (row == row_at.end()) {
            problems.add({csv.name, 0, 0}, "",
                         fmt::format("there is no row for {}, which is needed to interpolate; set "
                                     "points must fill a grid",
                                     text));
            return std::nullopt;
        }
        blend.rows.emplace_back(row->second, weight);
    }
    return blend;
}

/// Writes a value under a path of keys unless something stands there.
void write_value(YamlNode& plasma, const std::string& path, const std::string& text,
                 const Location& at) {
    YamlNode* node = &plasma;
    std::string rest = path;
    for (std::size_t dot = rest.find('.'); dot != std::string::npos; dot = rest.find('.')) {
        const std::string key = rest.substr(0, dot);
        rest = rest.substr(dot + 1);
        if (!node->find(key)) {
            YamlNode map;
            map.kind = YamlNode::Kind::map;
            map.at = at;
            node->members.push_back({key, at, map});
        }
        node = node->find(key);
        if (!node->is_map()) return; // given as something else: the reader will tell
    }
    if (node->find(rest)) return;
    YamlNode value;
    value.kind = YamlNode::Kind::scalar;
    value.text = text;
    value.at = at;
    node->members.push_back({rest, at, value});
}

void apply_table(YamlNode& plasma, const YamlNode& table, const YamlNode& at, Problems& problems) {
    const std::size_t before = problems.size();
    const std::string shown = std::filesystem::path(table.text).filename().string();
    if (!std::filesystem::is_regular_file(table.text)) {
        problems.add(table.at, table.path, fmt::format("no such file: {}", table.text));
        return;
    }
    const CsvRows csv = read_csv(table.text, shown, problems);
    if (problems.size() != before) return;
    const std::vector<Column> columns = read_columns(csv, problems);
    if (problems.size() != before) return;
    std::vector<std::string> names;
    for (const Column& column : columns)
        names.push_back(column.name);
    std::vector<const Column*> points;
    std::vector<Axis> axes;
    for (const YamlNode::Member& point : at.members) {
        const auto found = std::find(names.begin(), names.end(), point.key);
        if (found == names.end()) {
            problems.add(point.key_at, point.value.path,
                         fmt::format("the table has no such column; it has: {}{}", listed(names),
                                     did_you_mean(point.key, names)));
            continue;
        }
        points.push_back(&columns[found - names.begin()]);
        axes.emplace_back();
        if (point.value.is_scalar()) place(*points.back(), point.value, axes.back(), problems);
    }
    if (problems.size() != before || points.empty()) return;
    const std::optional<Blend> blend = blend_of(csv, points, axes, problems);
    if (!blend) return;
    for (const Column& column : columns) {
        if (std::find(points.begin(), points.end(), &column) != points.end()) continue;
        double value = 0;
        for (const auto& [row, weight] : blend->rows)
            value += weight * column.value[row];
        write_value(plasma, column.name, fmt::format("{:.12g} {}", value, column.unit), table.at);
    }
}

} // namespace

void apply_state_tables(YamlNode& root, Problems& problems) {
    YamlNode* plasmas = root.find("plasmas");
    if (!plasmas) return;
    for (YamlNode::Member& plasma : plasmas->members) {
        const YamlNode* state = plasma.value.find("state");
        if (!state || !state->is_map()) continue;
        const YamlNode *table = state->find("table"), *at = state->find("at");
        if (table && table->is_scalar() && at && at->is_map()) {
            const YamlNode file = *table, points = *at; // the plasma is written to
            apply_table(plasma.value, file, points, problems);
        }
    }
    set_paths(root, "");
}

} // namespace rille::engine
