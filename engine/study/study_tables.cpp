// SPDX-License-Identifier: Apache-2.0
// Tables that a study names: points, linked values, measured rows.
#include "engine/study/study_plan.hpp"

#include "engine/csv_rows.hpp"
#include "engine/output_folder.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>

namespace rille::engine {

namespace {

namespace fs = std::filesystem;

std::vector<AxisValue> column_values(const CsvRows& csv, std::size_t c, const std::string& unit) {
    std::vector<AxisValue> values;
    for (std::size_t row = 1; row < csv.rows.size(); ++row) {
        AxisValue value;
        value.node = cell_node(csv.rows[row][c], unit);
        values.push_back(std::move(value));
    }
    return values;
}

/// Rows of one width below their names; nothing and problems otherwise.
std::optional<CsvRows> table_of(StudyReading& r, const Entry& file) {
    const std::optional<std::string> path = keep_table(r, file);
    if (!path) return std::nullopt;
    const std::size_t before = r.problems.size();
    CsvRows csv = read_csv(*path, file.text, r.problems);
    if (r.problems.size() == before && csv.rows.size() < 2)
        r.problems.add({file.text, 0, 0}, "", "holds no rows below the names of the columns");
    for (const CsvRow& row : csv.rows)
        if (row.size() != csv.rows[0].size())
            r.problems.add(row[0].at, "",
                           fmt::format("{} values in a row of {}", row.size(), csv.rows[0].size()));
    if (r.problems.size() != before) return std::nullopt;
    return csv;
}

/// The column of a table that `wanted` names; nothing if none does.
std::optional<std::size_t> named(const CsvRows& csv, const std::string& wanted) {
    for (std::size_t c = 0; c < csv.rows[0].size(); ++c) {
        const std::string& text = csv.rows[0][c].text;
        if (text == wanted || heading_of(text).name == wanted) return c;
    }
    return std::nullopt;
}

std::vector<std::string> headings(const CsvRows& csv) {
    std::vector<std::string> names;
    for (const CsvCell& cell : csv.rows[0])
        names.push_back(heading_of(cell.text).name);
    return names;
}

struct LinkReader {
    StudyReading& r;
    const std::string& path;
    const Entry& entry;
    const CsvRows& csv;
    LinkedColumn link;

    void wrong(const Location& at, const std::string& message) {
        r.problems.add(at, entry.path, message);
    }

    /// Column of the table with the values.
    std::optional<std::size_t> values_in() {
        const Entry& column = entry["column"];
        std::optional<std::size_t> found;
        if (column.is_given) {
            found = named(csv, column.text);
        } else {
            for (std::size_t c = 0; c < csv.rows[0].size() && !found; ++c)
                if (ends_path(heading_of(csv.rows[0][c].text).name, path)) found = c;
        }
        const std::string wanted = column.is_given ? column.text : path.substr(path.rfind('.') + 1);
        if (!found)
            wrong(column.is_given ? column.at : entry.at,
                  fmt::format("{} has no column {}; there are: {}{}", csv.name, quoted(wanted),
                              listed(headings(csv)), did_you_mean(wanted, headings(csv))));
        return found;
    }

    /// Column of the table with the values of an axis, and that axis in link.by.
    std::optional<std::size_t> keys_in(std::size_t taken) {
        const auto& columns = r.study.columns;
        const Entry& by = entry["by"];
        if (by.is_given) {
            const auto axis = find_column(columns, by.text, by.at, by.path, r.problems);
            if (!axis) return std::nullopt;
            for (std::size_t c = 0; c < csv.rows[0].size(); ++c)
                if (c != taken &&
                    ends_path(heading_of(csv.rows[0][c].text).name, columns[*axis].path)) {
                    link.by = *axis;
                    return c;
                }
        }
        std::vector<std::pair<std::size_t, std::size_t>> fitting;
        for (std::size_t c = 0; c < csv.rows[0].size(); ++c)
            for (std::size_t a = 0; a < columns.size(); ++a)
                if (c != taken && !columns[a].is_linked && !by.is_given &&
                    ends_path(heading_of(csv.rows[0][c].text).name, columns[a].path))
                    fitting.emplace_back(c, a);
        if (fitting.size() == 1) {
            link.by = fitting[0].second;
            return fitting[0].first;
        }
        std::vector<std::string> labels;
        for (const StudyColumn& column : columns)
            if (!column.is_linked) labels.push_back(column.label);
        wrong(by.is_given ? by.at : entry.at,
              fmt::format("{} {} what is varied ({}); {}", csv.name,
                          fitting.empty() ? "has no column of" : "names several of", listed(labels),
                          fitting.empty() ? "its columns are: " + listed(headings(csv))
                                          : "say which by the key by"));
        return std::nullopt;
    }

    bool read() {
        const std::size_t before = r.problems.size();
        const auto values = values_in();
        const auto keys = values ? keys_in(*values) : std::nullopt;
        if (!values || !keys) return false;
        const std::string unit = heading_of(csv.rows[0][*values].text).unit;
        link.values = column_values(csv, *values, unit);
        link.keys = column_values(csv, *keys, heading_of(csv.rows[0][*keys].text).unit);
        check_values(r, link.by, link.keys);
        const auto column = add_column(r, path, entry.at);
        if (!column) return false;
        link.column = *column;
        r.study.columns[*column].is_linked = true;
        check_values(r, *column, link.values);
        if (r.problems.size() != before) return false;
        give_numbers(link.values, *r.rules[*column], r.study.columns[*column].unit);
        link.unit = r.study.columns[*column].unit;
        give_key_numbers();
        check_rows();
        return r.problems.size() == before;
    }

    /// Keys in the unit of the axis, whatever that of the table.
    void give_key_numbers() {
        const StudyColumn& axis = r.study.columns[link.by];
        if (axis.unit.empty()) return;
        AxisValue in_axis_unit;
        in_axis_unit.node = number_node(1, axis.unit == "1" ? "" : axis.unit, entry.at);
        link.keys.insert(link.keys.begin(), in_axis_unit);
        std::string unit;
        give_numbers(link.keys, *r.rules[link.by], unit);
        link.keys.erase(link.keys.begin());
        if (unit != axis.unit)
            wrong(entry.at, fmt::format("{} has values of {} that are no numbers in {}", csv.name,
                                        axis.label, axis.unit));
    }

    void check_rows() {
        for (std::size_t a = 0; a < link.keys.size(); ++a)
            for (std::size_t b = 0; b < a; ++b) {
                const bool same = link.keys[a].number && link.keys[b].number
                                      ? *link.keys[a].number == *link.keys[b].number
                                      : link.keys[a].text == link.keys[b].text;
                if (!same) continue;
                r.problems.add(link.keys[a].node.at, "",
                               fmt::format("{} stands in two rows; the first is on line {}",
                                           quoted(std::as_const(link.keys[a].text)),
                                           link.keys[b].node.at.line));
                return;
            }
        const bool numbers = link.keys[0].number && link.values[0].number;
        if (link.is_interpolated && !numbers)
            wrong(entry["between"].at, "only numbers can be interpolated");
    }
};

void read_link(StudyReading& r, const std::string& path, const Entry& entry) {
    if (!entry.is_good) return;
    const bool is_short = entry.rule->kind == Rule::Kind::text;
    const Entry& file = is_short ? entry : entry["table"];
    const std::optional<CsvRows> csv = table_of(r, file);
    if (!csv) return;
    LinkReader reader{r, path, entry, *csv, {}};
    reader.link.is_interpolated = entry["between"].text == "linear";
    reader.link.tolerance = is_short ? 1e-4 : entry["tolerance"].number;
    reader.link.file = fs::path(file.text).filename().string();
    if (!reader.read()) return;
    StudyColumn& column = r.study.columns[reader.link.column];
    column.follows = fmt::format(
        "follows {} by {}, {}", r.study.columns[reader.link.by].label, reader.link.file,
        reader.link.is_interpolated ? "interpolated between its rows"
                                    : fmt::format("row by row within {:.4g} %, not interpolated",
                                                  100 * reader.link.tolerance));
    r.plan.linked.push_back(std::move(reader.link));
}

} // namespace

Heading heading_of(const std::string& text) {
    const std::size_t open = text.find('['), line = text.rfind('_');
    if (open == std::string::npos && line != std::string::npos && line > 0)
        for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d)
            for (const UnitDefinition& unit : units_of(static_cast<Dimension>(d)))
                if (text.substr(line + 1) == unit.text) return {text.substr(0, line), unit.text};
    if (open == std::string::npos || text.back() != ']') return {trimmed(text), ""};
    return {trimmed(text.substr(0, open)), trimmed(text.substr(open + 1, text.size() - open - 2))};
}

YamlNode cell_node(const CsvCell& cell, const std::string& unit) {
    YamlNode node;
    node.kind = YamlNode::Kind::scalar;
    node.at = cell.at;
    node.text = cell.text;
    if (!unit.empty() && unit != "1") node.text += " " + unit;
    return node;
}

std::optional<AxisValue> LinkedColumn::at(const AxisValue& key, std::string& reason) const {
    const bool by_number = key.number && keys[0].number;
    std::size_t below = keys.size(), above = keys.size();
    for (std::size_t k = 0; k < keys.size(); ++k) {
        if (!by_number) {
            if (keys[k].text == key.text) return values[k];
            continue;
        }
        const double here = *keys[k].number, x = *key.number;
        if (std::abs(here - x) <= tolerance * std::max(std::abs(here), std::abs(x)))
            return values[k];
        if (here < x && (below == keys.size() || here > *keys[below].number)) below = k;
        if (here > x && (above == keys.size() || here < *keys[above].number)) above = k;
    }
    const bool is_inside = below < keys.size() && above < keys.size();
    if (!is_interpolated || !is_inside) {
        reason = fmt::format("{} has no row for {}{}", file, quoted(key.text),
                             is_interpolated ? "; tables are not extrapolated"
                             : is_inside ? fmt::format("; nearest are {} and {} (between: linear "
                                                       "interpolates)",
                                                       keys[below].text, keys[above].text)
                                         : "");
        return std::nullopt;
    }
    const double part =
        (*key.number - *keys[below].number) / (*keys[above].number - *keys[below].number);
    const double number =
        *values[below].number + part * (*values[above].number - *values[below].number);
    AxisValue value;
    value.node = number_node(number, unit == "1" ? "" : unit, values[below].node.at);
    value.node.path = values[below].node.path;
    value.text = value.node.text;
    value.number = split_number(value.text).value;
    return value;
}

std::optional<std::string> keep_table(StudyReading& r, const Entry& file) {
    if (!file.is_good) return std::nullopt;
    const fs::path path = fs::absolute(fs::path(r.folder) / file.text).lexically_normal();
    if (!fs::is_regular_file(path)) {
        r.problems.add(file.at, file.path, fmt::format("no such file: {}", path.string()));
        return std::nullopt;
    }
    keep_input(r.study, path.string());
    return path.string();
}

std::string keep_input(Study& study, const std::string& path) {
    for (const InputFile& taken : study.inputs)
        if (taken.path == path) return taken.name;
    const fs::path file(path);
    std::string name;
    for (int n = 1; name.empty(); ++n) {
        const std::string tail = n > 1 ? "-" + std::to_string(n) : "";
        name = "inputs/" + file.stem().string() + tail + file.extension().string();
        for (const InputFile& taken : study.inputs)
            if (taken.name == name) name.clear();
    }
    study.inputs.push_back({path, name, read_file(path)});
    return name;
}

void read_points_table(StudyReading& r, const Entry& file) {
    const std::optional<CsvRows> csv = table_of(r, file);
    if (!csv) return;
    r.plan.drawn = csv->rows.size() - 1;
    for (std::size_t c = 0; c < csv->rows[0].size(); ++c) {
        const Heading heading = heading_of(csv->rows[0][c].text);
        const auto column = add_column(r, heading.name, csv->rows[0][c].at);
        if (!column) continue;
        Axis axis;
        axis.column = *column;
        axis.at = csv->rows[0][c].at;
        axis.values = column_values(*csv, c, heading.unit);
        check_values(r, *column, axis.values);
        give_numbers(axis.values, *r.rules[*column], r.study.columns[*column].unit);
        r.plan.axes.push_back(std::move(axis));
    }
}

void read_linked(StudyReading& r) {
    for (const auto& [path, entry] : r.root["linked"].members)
        read_link(r, path, entry);
    label_columns(r.study.columns);
}

void read_comparison(StudyReading& r) {
    const Entry& compare = r.root["compare"];
    if (!compare.is_good) return;
    const std::optional<CsvRows> csv = table_of(r, compare["measured"]);
    if (!csv) return;
    StudyComparison result;
    result.file = *keep_table(r, compare["measured"]);
    result.tolerance = compare["tolerance"].number;
    const auto column = [&](const Entry& entry) {
        if (entry.is_good && !named(*csv, entry.text))
            r.problems.add(entry.at, entry.path,
                           fmt::format("{} has no column {}; there are: {}{}", csv->name,
                                       quoted(entry.text), listed(headings(*csv)),
                                       did_you_mean(entry.text, headings(*csv))));
        return entry.text;
    };
    for (const Entry& join : compare["join"].items) {
        if (!join.is_good || r.has_lost_columns) continue;
        const auto varied = find_column(r.study.columns, join.text, join.at, join.path, r.problems);
        if (!varied) continue;
        const std::vector<std::string> names = headings(*csv);
        const bool is_there = std::any_of(names.begin(), names.end(), [&](const auto& name) {
            return ends_path(name, r.study.columns[*varied].path);
        });
        if (!is_there) column(join);
        result.join.push_back(*varied);
    }
    result.value = column(compare["value"]);
    result.sigma = column(compare["sigma"]);
    result.sites = column(compare["sites"]);
    r.study.comparison = std::move(result);
}

} // namespace rille::engine
