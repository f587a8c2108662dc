// SPDX-License-Identifier: Apache-2.0
// Plans whose points do not line up: a metric against each axis on its own.
#include "engine/report/study_figures.hpp"
#include "engine/report/study_parts.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <filesystem>
#include <fmt/format.h>

namespace rille::engine {
namespace {

constexpr std::size_t most_markers = 1500, most_slices = 12, most_metrics = 4;

struct ScatterMarks {
    std::size_t stride = 1, without = 0;
    bool any_open = false, any_error = false;
};

ChartLine scatter_points(const StudyView& view, const StudyAxis& axis, std::size_t metric,
                         ScatterMarks& marks) {
    ChartLine line;
    line.is_joined = false;
    for (std::size_t row = 0; row < view.table.rows(); ++row) {
        const auto value = view.table.number(row, metric);
        if (!value) {
            ++marks.without;
            continue;
        }
        if (row % marks.stride != 0) continue;
        const double error = view.error(row, metric);
        line.points.push_back({axis.place(row), *value, error, view.is_open(row),
                               std::to_string(row), view.words(row)});
        marks.any_open = marks.any_open || view.is_open(row);
        marks.any_error = marks.any_error || error > 0;
    }
    return line;
}

std::vector<std::string> scatter_notes(const ScatterMarks& marks) {
    std::vector<std::string> notes{"The other inputs differ from point to point."};
    notes[0] += marks.any_error ? " Bars: 95 % sampling error; grid error is not in them."
                                : " No sampling error; grid error is not assessed.";
    if (marks.any_open)
        notes[0] += " Open markers: not cleared or clogged, so the value is a bound.";
    if (marks.without > 0)
        notes.push_back(
            fmt::format("No value from {} point{}.", marks.without, marks.without == 1 ? "" : "s"));
    if (marks.stride > 1)
        notes.push_back(fmt::format("One marker for every {} points.", marks.stride));
    return notes;
}

/// What the page asks about, or the first metric that any point has.
std::vector<std::size_t> scatter_metrics(const StudyView& view) {
    std::vector<std::size_t> metrics = asked_metrics(view, most_metrics);
    if (!metrics.empty()) return metrics;
    for (const std::size_t column : view.table.all(StudyTableColumn::Role::metric))
        for (std::size_t row = 0; row < view.table.rows(); ++row)
            if (view.table.number(row, column)) return {column};
    return {};
}

} // namespace

std::vector<LineChart> scatter_charts(const StudyView& view, std::size_t metric_column) {
    std::vector<LineChart> charts;
    const std::string name = view.metric_name(metric_column);
    for (const StudyAxis& axis : view.axes) {
        if (!axis.is_free()) continue;
        ScatterMarks marks;
        marks.stride = std::max<std::size_t>(1, view.table.rows() / most_markers);
        LineChart chart;
        chart.x = axis.chart_axis();
        chart.y.title = name;
        chart.y.unit = view.table.columns[metric_column].unit;
        chart.lines.push_back(scatter_points(view, axis, metric_column, marks));
        if (chart.lines.front().points.empty()) continue;
        chart.text = view.figure_text(fmt::format("scatter-{}-{}",
                                                  id_of(view.table.columns[metric_column].name),
                                                  charts.size() + 1),
                                      name + " against " + axis.title);
        chart.text.notes = scatter_notes(marks);
        charts.push_back(std::move(chart));
    }
    return charts;
}

PageSection scatter_section(const StudyParts& p) {
    PageSection section{"scatter", "Against each input", "", false};
    const std::vector<std::size_t> axes = map_axes(p.view);
    if (axes.size() < 2 || !study_slices(p.view, axes, most_slices).empty()) return section;
    std::vector<std::pair<std::string, std::string>> parts; // name of the metric, its figures
    for (const std::size_t metric : scatter_metrics(p.view)) {
        std::string html;
        for (const LineChart& chart : scatter_charts(p.view, metric))
            html += figure_html(p.show_small(chart, "A marker shows its point's profile."));
        if (!html.empty())
            parts.emplace_back(p.view.metric_name(metric),
                               "<div class=\"charts\">\n" + html + "</div>\n");
    }
    if (parts.empty()) return section;
    const bool has_effects = std::filesystem::exists(std::filesystem::path(p.view.table.folder) /
                                                     study_names::effects_json);
    section.html = std::string("<p>The points of this plan do not line up, so no curve joins them: "
                               "each chart shows all of them against one input.") +
                   (has_effects ? " What an input does on its own stands under <a "
                                  "href=\"#effects\">What matters most</a>."
                                : "") +
                   "</p>\n" + choice_html("scatter-choice", "Shown for", parts);
    return section;
}

} // namespace rille::engine
