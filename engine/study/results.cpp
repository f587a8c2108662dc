// SPDX-License-Identifier: Apache-2.0
#include "engine/study/results.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/results_columns.hpp"
#include "engine/study/study_names.hpp"

#include <charconv>
#include <filesystem>
#include <fmt/format.h>
#include <fstream>

namespace rille::engine {
namespace {

/// The cells of a line (RFC 4180; no cell spans lines). Returns how many there were.
std::size_t split_line(const std::string& line, StudyTable& table) {
    std::size_t count = 0, at = 0;
    while (at <= line.size()) {
        std::string cell;
        if (at < line.size() && line[at] == '"') {
            for (++at; at < line.size(); ++at) {
                if (line[at] == '"' && (++at >= line.size() || line[at] != '"')) break;
                cell += line[at];
            }
        } else {
            const std::size_t comma = std::min(line.find(',', at), line.size());
            cell = line.substr(at, comma - at);
            at = comma;
        }
        ++at; // the comma
        ++count;
        table.add_cell(cell);
    }
    return count;
}

} // namespace

void StudyTable::add_cell(std::string_view text) {
    cells_ += text;
    ends_.push_back(cells_.size());
}

std::string_view StudyTable::text(std::size_t row, std::size_t column) const {
    const std::size_t cell = row * columns.size() + column;
    const std::size_t start = cell ? ends_[cell - 1] : 0;
    return std::string_view(cells_).substr(start, ends_[cell] - start);
}

std::optional<double> StudyTable::number(std::size_t row, std::size_t column) const {
    const std::string_view cell = text(row, column);
    double value = 0;
    const auto [end, error] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
    if (cell.empty() || error != std::errc() || end != cell.data() + cell.size())
        return std::nullopt;
    return value;
}

std::optional<std::size_t> StudyTable::find(const std::string& name) const {
    for (std::size_t c = 0; c < columns.size(); ++c)
        if (columns[c].name == name) return c;
    return std::nullopt;
}

std::optional<std::size_t> StudyTable::find(StudyTableColumn::Role role) const {
    for (std::size_t c = 0; c < columns.size(); ++c)
        if (columns[c].role == role) return c;
    return std::nullopt;
}

std::vector<std::size_t> StudyTable::all(StudyTableColumn::Role role) const {
    std::vector<std::size_t> found;
    for (std::size_t c = 0; c < columns.size(); ++c)
        if (columns[c].role == role) found.push_back(c);
    return found;
}

std::optional<std::size_t> StudyTable::metric(const std::string& name,
                                              const std::string& feature) const {
    for (std::size_t c = 0; c < columns.size(); ++c)
        if (columns[c].role == StudyTableColumn::Role::metric && columns[c].label == name &&
            (feature.empty() || columns[c].feature == feature))
            return c;
    return std::nullopt;
}

std::optional<std::size_t> StudyTable::error_of(std::size_t metric_column) const {
    const std::size_t next = metric_column + 1;
    if (next >= columns.size() || columns[next].role != StudyTableColumn::Role::error)
        return std::nullopt;
    return next;
}

StudyTable read_study_table(const std::string& folder) {
    const std::string path = (std::filesystem::path(folder) / study_names::results).string();
    constexpr const char* tried = "cannot read the results of a study";
    std::ifstream file(path, std::ios::binary);
    if (!file) throw OutputError(path, tried, "there is no such file");
    StudyTable table;
    table.folder = folder;
    bool in_header = true;
    std::size_t number = 0;
    for (std::string line; std::getline(file, line);) {
        ++number;
        if (in_header && line.rfind("# ", 0) == 0) {
            read_header_line(line, table);
            continue;
        }
        if (in_header) {
            in_header = false;
            std::string names;
            for (const StudyTableColumn& column : table.columns)
                names += (names.empty() ? "" : ",") + column.name;
            if (names.empty() || names != line)
                throw OutputError(path, tried, "its columns are not those that are described");
            continue;
        }
        const std::size_t cells = split_line(line, table);
        if (cells != table.columns.size())
            throw OutputError(
                path, tried,
                fmt::format("line {} has {} cells, not {}", number, cells, table.columns.size()));
    }
    return table;
}

} // namespace rille::engine
