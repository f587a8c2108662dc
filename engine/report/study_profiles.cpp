// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_profiles.hpp"

#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"
#include "engine/report/section_sheet.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <sstream>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using Points = std::vector<std::array<double, 2>>;

constexpr double outline_tolerance_nm = 0.1;
constexpr std::size_t most_panels = 10, most_rows = 16, most_slices = 12;

/// The columns wanted of a profile.csv, row by row; NaN where there is none.
std::vector<std::vector<double>> csv_numbers(const std::string& csv,
                                             const std::vector<std::string>& wanted) {
    std::vector<std::vector<double>> values(wanted.size());
    std::istringstream stream(csv);
    std::string line;
    while (std::getline(stream, line) && (line.empty() || line[0] == '#'))
        continue;
    std::vector<std::size_t> target; // of each column of the file; wanted.size() = none
    std::istringstream names(line);
    for (std::string name; std::getline(names, name, ',');)
        target.push_back(static_cast<std::size_t>(std::find(wanted.begin(), wanted.end(), name) -
                                                  wanted.begin()));
    std::size_t needed = 0;
    for (std::size_t c = 0; c < target.size(); ++c)
        if (target[c] < wanted.size()) needed = c + 1;
    while (std::getline(stream, line)) {
        for (auto& column : values)
            column.push_back(std::nan(""));
        const char* at = line.c_str();
        for (std::size_t c = 0; c < needed && at; ++c) {
            if (target[c] < wanted.size()) values[target[c]].back() = std::strtod(at, nullptr);
            at = std::strchr(at, ',');
            if (at) ++at;
        }
    }
    return values;
}

/// Centres of one chain's elements, drawn out by half an element at open ends.
SectionLine chain_line(const Points& centres, const std::vector<double>& lengths) {
    SectionLine line;
    line.points = centres;
    if (centres.size() < 2) return line;
    const auto gap =
        std::hypot(centres.front()[0] - centres.back()[0], centres.front()[1] - centres.back()[1]);
    line.closed = centres.size() > 3 && gap < 1.5 * (lengths.front() + lengths.back());
    if (line.closed) {
        line.points.push_back(line.points.front());
        return line;
    }
    const auto beyond = [](const std::array<double, 2>& end, const std::array<double, 2>& next,
                           double length) -> std::array<double, 2> {
        const double apart = std::hypot(end[0] - next[0], end[1] - next[1]);
        const double share = apart > 0 ? 0.5 * length / apart : 0;
        return {end[0] + share * (end[0] - next[0]), end[1] + share * (end[1] - next[1])};
    };
    line.points.insert(line.points.begin(), beyond(centres[0], centres[1], lengths.front()));
    line.points.push_back(beyond(centres.back(), centres[centres.size() - 2], lengths.back()));
    return line;
}

Section flat_section(const std::vector<std::vector<double>>& v) {
    Section section;
    Points centres;
    std::vector<double> lengths;
    const auto flush = [&] {
        if (!centres.empty()) section.push_back(chain_line(centres, lengths));
        centres.clear();
        lengths.clear();
    };
    for (std::size_t i = 0; i < v[0].size(); ++i) {
        if (i > 0 && v[3][i] != v[3][i - 1]) flush();
        if (!std::isfinite(v[0][i]) || !std::isfinite(v[1][i])) continue;
        centres.push_back({v[0][i], v[1][i]});
        lengths.push_back(std::isfinite(v[2][i]) ? v[2][i] : 0);
    }
    flush();
    return section;
}

/// Elements within half a spacing of y = 0, each joined to the nearest that is left.
Section middle_section(const std::vector<std::vector<double>>& v) {
    double area = 0;
    for (const double a : v[3])
        area += std::isfinite(a) ? a : 0;
    const double spacing = v[3].empty() ? 0 : std::sqrt(area / static_cast<double>(v[3].size()));
    Points left;
    for (std::size_t i = 0; i < v[0].size(); ++i)
        if (std::fabs(v[1][i]) <= 0.5 * spacing) left.push_back({v[0][i], v[2][i]});
    std::sort(left.begin(), left.end());
    Section section;
    while (!left.empty()) {
        SectionLine line;
        line.points.push_back(left.front());
        left.erase(left.begin());
        while (!left.empty()) {
            const auto& end = line.points.back();
            const auto next =
                std::min_element(left.begin(), left.end(), [&](const auto& a, const auto& b) {
                    return std::hypot(a[0] - end[0], a[1] - end[1]) <
                           std::hypot(b[0] - end[0], b[1] - end[1]);
                });
            if (std::hypot((*next)[0] - end[0], (*next)[1] - end[1]) > 3 * spacing) break;
            line.points.push_back(*next);
            left.erase(next);
        }
        if (line.points.size() > 2) section.push_back(line);
    }
    return section;
}

/// At most `most` of `count` indices, evenly, with the first and the last.
std::vector<std::size_t> some_of(std::size_t count, std::size_t most) {
    std::vector<std::size_t> chosen;
    const std::size_t taken = std::min(count, most);
    for (std::size_t i = 0; i < taken; ++i)
        chosen.push_back(taken == 1 ? 0 : i * (count - 1) / (taken - 1));
    return chosen;
}

ProfileOutline panel_of(const StudyView& view, ProfileShelf& shelf, std::size_t row) {
    const StudyAxis& x = view.axes[*view.x];
    ProfileOutline panel;
    panel.name = x.value_text(x.level[row]);
    panel.lines = shelf.outline(row);
    panel.key = std::to_string(row);
    panel.words = view.words(row);
    panel.is_failed = !view.has_result(row);
    const std::string value = view.y ? view.value_text(row, *view.y) : "";
    panel.note = panel.is_failed       ? view.status(row)
                 : panel.lines.empty() ? "no profile kept"
                 : value.empty()       ? view.status(row)
                 : view.is_open(row)   ? "(" + value + unit_suffix(view.y_unit()) + ")"
                                       : value + unit_suffix(view.y_unit());
    return panel;
}

} // namespace

Section profile_outline(const std::string& csv, double tolerance_nm) {
    Section section;
    const std::size_t head = csv.find("x_nm,");
    const bool is_flat = csv.compare(head == std::string::npos ? 0 : head, 10, "x_nm,z_nm,") == 0;
    const bool is_half = csv.find("r_nm,z_nm,") != std::string::npos && head == std::string::npos;
    if (is_half) {
        section = flat_section(csv_numbers(csv, {"r_nm", "z_nm", "length_nm", "chain"}));
        const std::size_t count = section.size();
        for (std::size_t i = 0; i < count; ++i) { // the other side of the axis
            section.push_back(section[i]);
            for (auto& p : section.back().points)
                p[0] = -p[0];
        }
    } else
        section = is_flat ? flat_section(csv_numbers(csv, {"x_nm", "z_nm", "length_nm", "chain"}))
                          : middle_section(csv_numbers(csv, {"x_nm", "y_nm", "z_nm", "area_nm2"}));
    for (SectionLine& line : section)
        line.points = thinned(line.points, tolerance_nm);
    return section;
}

const Section& ProfileShelf::outline(std::size_t row) {
    const auto found = read_.find(row);
    if (found != read_.end()) return found->second;
    Section section;
    const fs::path path = fs::path(view_.table.folder) / study_names::points / view_.point(row) /
                          output_names::profile;
    std::error_code ignored;
    if (fs::exists(path, ignored))
        section = profile_outline(read_file(path.string()), outline_tolerance_nm);
    return read_.emplace(row, std::move(section)).first->second;
}

nlohmann::json ProfileShelf::json_of(std::size_t most, std::size_t& stride) {
    nlohmann::json profiles = nlohmann::json::object();
    stride = std::max<std::size_t>(1, (view_.table.rows() + most - 1) / most);
    for (std::size_t row = 0; row < view_.table.rows(); row += stride) {
        nlohmann::json parts = nlohmann::json::array();
        for (const SectionLine& line : outline(row)) {
            nlohmann::json part = nlohmann::json::array();
            for (const auto& p : line.points)
                for (const double v : p)
                    part.push_back(std::round(10 * v) / 10);
            parts.push_back(std::move(part));
        }
        if (!parts.empty()) profiles[std::to_string(row)] = std::move(parts);
    }
    return profiles;
}

std::vector<std::pair<std::string, ProfileRow>> profile_rows(const StudyView& view,
                                                             ProfileShelf& shelf) {
    std::vector<std::pair<std::string, ProfileRow>> rows;
    if (!view.x || view.table.rows() == 0) return rows;
    const StudyAxis& x = view.axes[*view.x];
    std::vector<std::size_t> shown{*view.x};
    if (view.line) shown.push_back(*view.line);
    std::vector<StudySlice> slices = study_slices(view, shown, most_slices);
    const bool is_grid = !slices.empty(), by_line = view.line && is_grid;
    if (!is_grid) slices = {whole_study(view)};
    for (const StudySlice& slice : slices) {
        std::map<std::size_t, std::map<std::size_t, std::size_t>> lines; // line, x level: first row
        for (const std::size_t row : slice.rows)
            lines[by_line ? view.axes[*view.line].level[row] : 0].emplace(x.level[row], row);
        for (const auto& [level, points] : lines) {
            if (rows.size() >= most_rows) return rows;
            std::vector<std::size_t> along;
            for (const auto& [x_level, row] : points)
                along.push_back(row);
            ProfileRow row;
            std::string name = slice.name;
            if (by_line)
                name = view.axes[*view.line].title + " " + view.axes[*view.line].value_text(level) +
                       (name.empty() ? "" : ", " + name);
            const std::string id =
                rows.empty() ? "profiles" : "profiles-" + std::to_string(rows.size() + 1);
            row.text = view.figure_text(id, "Final profiles" + (name.empty() ? "" : ", " + name));
            row.axis_title = "along " + x.title + (x.unit.empty() ? "" : " (" + x.unit + ")");
            for (const std::size_t i : some_of(along.size(), most_panels))
                row.panels.push_back(panel_of(view, shelf, along[i]));
            if (!is_grid)
                row.text.notes.emplace_back("The other inputs differ from point to point.");
            if (along.size() > most_panels)
                row.text.notes.push_back(std::to_string(most_panels) + " of " +
                                         std::to_string(along.size()) + " points are shown.");
            if (std::any_of(points.begin(), points.end(),
                            [&](const auto& point) { return view.is_open(point.second); }))
                row.text.notes.emplace_back("In brackets: not cleared or clogged.");
            const bool any = std::any_of(row.panels.begin(), row.panels.end(),
                                         [](const ProfileOutline& p) { return !p.lines.empty(); });
            if (any) rows.emplace_back(name, std::move(row));
        }
    }
    return rows;
}

} // namespace rille::engine
