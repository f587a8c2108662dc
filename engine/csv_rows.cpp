// SPDX-License-Identifier: Apache-2.0
#include "engine/csv_rows.hpp"

#include "engine/units.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <fstream>
#include <sstream>

namespace rille::engine {

namespace {

CsvRow split_row(const std::string& raw, const std::string& name, int line) {
    CsvRow row;
    std::size_t start = 0;
    while (start <= raw.size()) {
        const std::size_t comma = std::min(raw.find(',', start), raw.size());
        const std::string cell = raw.substr(start, comma - start);
        const std::size_t skip = cell.find_first_not_of(" \t");
        const int column = static_cast<int>(start + (skip == std::string::npos ? 0 : skip)) + 1;
        row.push_back({trimmed(cell), {name, line, column}});
        start = comma + 1;
    }
    while (row.size() > 1 && row.back().text.empty())
        row.pop_back();
    return row;
}

} // namespace

CsvRows split_csv(const std::string& text, const std::string& name) {
    CsvRows csv{name, {}, {}};
    std::istringstream stream(text);
    int line = 0;
    for (std::string raw; std::getline(stream, raw);) {
        ++line;
        const std::string trim = trimmed(raw);
        if (trim.empty()) continue;
        if (trim[0] != '#') {
            csv.rows.push_back(split_row(raw, name, line));
            continue;
        }
        const std::size_t equals = trim.find('=');
        if (equals == std::string::npos) continue; // a remark
        csv.header.emplace_back(trimmed(trim.substr(1, equals - 1)),
                                CsvCell{trimmed(trim.substr(equals + 1)), {name, line, 1}});
    }
    return csv;
}

CsvRows read_csv(const std::string& path, const std::string& shown, Problems& problems) {
    std::ifstream file(path, std::ios::binary);
    std::ostringstream text;
    if (file) text << file.rdbuf();
    if (!file || text.str().empty()) problems.add({shown, 0, 0}, "", "cannot be read, or is empty");
    return split_csv(text.str(), shown);
}

double csv_number(const CsvCell& cell, bool may_be_negative, Problems& problems) {
    const NumberText read = split_number(cell.text);
    if (!read.error.empty())
        problems.add(cell.at, "", read.error);
    else if (!read.unit.empty())
        problems.add(cell.at, "", fmt::format("{}: a plain number is due", quoted(cell.text)));
    else if (!may_be_negative && read.value < 0)
        problems.add(cell.at, "", fmt::format("{} is negative", quoted(cell.text)));
    else
        return read.value;
    return 0;
}

std::vector<std::vector<double>>
csv_columns(const CsvRows& csv, const std::vector<std::string>& names, Problems& problems) {
    const std::size_t before = problems.size();
    if (csv.rows.empty()) {
        problems.add(
            {csv.name, 0, 0}, "",
            fmt::format("holds no rows; the first must name the columns {}", listed(names)));
        return {};
    }
    const CsvRow& first = csv.rows[0];
    for (std::size_t c = 0; c < names.size(); ++c)
        if (c >= first.size() || first[c].text != names[c]) {
            const CsvCell& cell = first[std::min(c, first.size() - 1)];
            problems.add(cell.at, "",
                         fmt::format("{} stands where the columns {} must be named",
                                     quoted(cell.text), listed(names)));
            return {};
        }
    std::vector<std::vector<double>> columns(names.size());
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        const CsvRow& row = csv.rows[r];
        if (row.size() != names.size()) {
            problems.add(row[0].at, "",
                         fmt::format("{} values in a row of {} ({})", row.size(), names.size(),
                                     listed(names)));
            continue;
        }
        for (std::size_t c = 0; c < names.size(); ++c)
            columns[c].push_back(csv_number(row[c], true, problems));
    }
    if (problems.size() != before) return {};
    return columns;
}

} // namespace rille::engine
