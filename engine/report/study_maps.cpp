// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_figures.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using Role = StudyTableColumn::Role;

constexpr std::size_t most_slices = 12, most_on_axis = 32;

std::string axis_heading(const StudyAxis& axis) {
    return axis.unit.empty() ? axis.title : axis.title + " (" + axis.unit + ")";
}

/// Fills one cell from the rows that lie in it (several where seeds repeat).
using FillCell = void (*)(const StudyView&, const std::vector<std::size_t>& rows,
                          const std::optional<std::size_t>& column, HeatCell&);

void fill_value(const StudyView& view, const std::vector<std::size_t>& rows,
                const std::optional<std::size_t>& column, HeatCell& cell) {
    double sum = 0;
    int count = 0;
    bool is_open = false;
    for (const std::size_t row : rows)
        if (const auto value = view.table.number(row, *column)) {
            sum += *value;
            ++count;
            is_open = is_open || view.is_open(row);
        }
    if (count == 0) {
        cell.kind = CellKind::failed;
        return;
    }
    cell.kind = is_open ? CellKind::open : CellKind::value;
    cell.value = sum / count;
    cell.text = count == 1 ? view.value_text(rows.front(), *column)
                           : fmt::format("{:.4g} of {}", *cell.value, count);
    if (cell.text.empty()) cell.text = fmt::format("{:.4g}", *cell.value);
}

void fill_verdict(const StudyView& view, const std::vector<std::size_t>& rows,
                  const std::optional<std::size_t>& column, HeatCell& cell) {
    cell.kind = CellKind::failed;
    for (const std::size_t row : rows) { // the worst of the repeats
        const std::string verdict =
            column ? std::string(view.table.text(row, *column)) : window_verdict(view, row);
        const CellKind kind = verdict == "met"         ? CellKind::met
                              : verdict == "missed"    ? CellKind::missed
                              : verdict == "undecided" ? CellKind::undecided
                                                       : CellKind::failed;
        const auto rank = [](CellKind k) {
            return k == CellKind::failed      ? 0
                   : k == CellKind::met       ? 1
                   : k == CellKind::undecided ? 2
                                              : 3;
        };
        if (rank(kind) > rank(cell.kind)) cell.kind = kind;
    }
}

/// The levels of an axis that a map shows, evenly chosen, and where each level stands among them.
struct ShownLevels {
    std::vector<std::string> labels;
    std::vector<std::optional<std::size_t>> place; ///< of each level; empty: not shown
};

ShownLevels shown_levels(const StudyAxis& axis) {
    ShownLevels shown;
    const std::size_t count = axis.labels.size(), taken = std::min(count, most_on_axis);
    shown.place.resize(count);
    for (std::size_t i = 0; i < taken; ++i) {
        const std::size_t level = taken == 1 ? 0 : i * (count - 1) / (taken - 1);
        shown.place[level] = i;
        shown.labels.push_back(axis.labels[level]);
    }
    return shown;
}

HeatMap map_of(const StudyView& view, const StudySlice& slice, const std::vector<std::size_t>& axes,
               const std::optional<std::size_t>& column, FillCell fill) {
    const StudyAxis& x = view.axes[axes[0]];
    const StudyAxis* y = axes.size() > 1 ? &view.axes[axes[1]] : nullptr;
    HeatMap map;
    map.x_title = axis_heading(x);
    const ShownLevels across = shown_levels(x), up = y ? shown_levels(*y) : ShownLevels{{""}, {0}};
    map.x_values = across.labels;
    map.y_title = y ? axis_heading(*y) : "";
    map.y_values = up.labels;
    std::vector<std::vector<std::size_t>> rows(map.x_values.size() * map.y_values.size());
    for (const std::size_t row : slice.rows) {
        const auto i = across.place[x.level[row]], j = up.place[y ? y->level[row] : 0];
        if (i && j) rows[*j * map.x_values.size() + *i].push_back(row);
    }
    for (std::size_t c = 0; c < rows.size(); ++c) {
        HeatCell cell;
        if (!rows[c].empty()) {
            cell.key = std::to_string(rows[c].front());
            cell.words = view.words(rows[c].front());
            fill(view, rows[c], column, cell);
        }
        map.cells.push_back(std::move(cell));
    }
    return map;
}

std::vector<std::pair<std::string, HeatMap>> all_maps(const StudyView& view, const std::string& id,
                                                      const std::string& title,
                                                      const std::optional<std::size_t>& column,
                                                      FillCell fill) {
    std::vector<std::pair<std::string, HeatMap>> maps;
    const std::vector<std::size_t> axes = map_axes(view);
    if (axes.empty() || view.table.rows() == 0) return maps;
    std::string part;
    for (const std::size_t a : axes)
        if (view.axes[a].labels.size() > most_on_axis)
            part += (part.empty() ? "" : ", ") + fmt::format("{} of {} values of {}", most_on_axis,
                                                             view.axes[a].labels.size(),
                                                             view.axes[a].title);
    for (const StudySlice& slice : study_slices(view, axes, most_slices)) {
        HeatMap map = map_of(view, slice, axes, column, fill);
        map.text = view.figure_text(maps.empty() ? id : id + "-" + std::to_string(maps.size() + 1),
                                    slice.name.empty() ? title : title + ", " + slice.name);
        if (!part.empty()) map.text.notes.push_back("Shown: " + part + ".");
        maps.emplace_back(slice.name, std::move(map));
    }
    return maps;
}

} // namespace

std::vector<std::size_t> map_axes(const StudyView& view) {
    std::vector<std::size_t> axes;
    const auto add = [&](std::size_t a) {
        if (axes.size() < 2 && view.axes[a].is_free() &&
            std::find(axes.begin(), axes.end(), a) == axes.end())
            axes.push_back(a);
    };
    if (view.x) add(*view.x);
    if (view.line) add(*view.line);
    for (std::size_t a = 0; a < view.axes.size(); ++a)
        add(a);
    return axes;
}

std::vector<std::size_t> asked_metrics(const StudyView& view, std::size_t most) {
    std::vector<std::size_t> metrics;
    if (view.y) metrics.push_back(*view.y);
    for (const std::size_t column : view.table.all(Role::target)) {
        const auto metric =
            view.table.metric(view.table.columns[column].label, view.table.columns[column].feature);
        if (metric && std::find(metrics.begin(), metrics.end(), *metric) == metrics.end())
            metrics.push_back(*metric);
    }
    metrics.resize(std::min(metrics.size(), most));
    return metrics;
}

std::string window_verdict(const StudyView& view, std::size_t row) {
    std::string verdict;
    for (const std::size_t column : view.table.all(Role::target)) {
        const std::string_view one = view.table.text(row, column);
        if (one == "missed") return "missed";
        if (one == "undecided") verdict = "undecided";
        if (one == "met" && verdict.empty()) verdict = "met";
    }
    return verdict;
}

std::vector<std::pair<std::string, HeatMap>> metric_maps(const StudyView& view,
                                                         std::size_t metric_column) {
    if (map_axes(view).size() < 2) return {};
    const std::string title = view.metric_name(metric_column);
    const std::string& unit = view.table.columns[metric_column].unit;
    auto maps = all_maps(view, "map-" + id_of(view.table.columns[metric_column].name), title,
                         metric_column, fill_value);
    for (auto& [name, map] : maps) {
        map.value_title = title + (unit.empty() || unit == "1" ? "" : " (" + unit + ")");
        map.text.notes.emplace_back("± 95 % sampling error; grid error is not in it.");
    }
    return maps;
}

std::vector<std::pair<std::string, HeatMap>>
window_maps(const StudyView& view, const std::optional<std::size_t>& target_column) {
    const std::string title =
        target_column ? "Target on " + metric_title(view.table.columns[*target_column].label)
                      : "All targets";
    const std::string id =
        target_column ? "window-" + id_of(view.table.columns[*target_column].name) : "window";
    auto maps = all_maps(view, id, title, target_column, fill_verdict);
    for (auto& [name, map] : maps)
        map.text.notes.emplace_back(
            "Undecided: the error bar straddles the limit, or a parameter that governs the result "
            "is illustrative, from memory or out of its range.");
    return maps;
}

std::string choice_html(const std::string& id, const std::string& label,
                        const std::vector<std::pair<std::string, std::string>>& parts) {
    std::string html;
    if (parts.size() > 1) {
        html += "<p class=\"choice screen-only\"><label>" + escaped(label) + " <select id=\"" + id +
                "\" data-choose=\"" + id + "-figures\">";
        for (std::size_t i = 0; i < parts.size(); ++i)
            html += "<option value=\"" + std::to_string(i) + "\">" + escaped(parts[i].first) +
                    "</option>";
        html += "</select></label></p>\n";
    }
    html += "<div id=\"" + id + "-figures\">\n";
    for (const auto& part : parts)
        html += part.second;
    return html + "</div>\n";
}

std::string slices_html(const std::string& id, const std::string& label,
                        const std::vector<SliceFigure>& figures) {
    std::vector<std::pair<std::string, std::string>> parts;
    for (const SliceFigure& slice : figures)
        parts.emplace_back(slice.name, figure_html(slice.figure));
    return choice_html(id, label, parts);
}

} // namespace rille::engine
