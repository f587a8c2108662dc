// SPDX-License-Identifier: Apache-2.0
#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/report/study_parts.hpp"
#include "engine/study/study_names.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>
#include <set>

namespace rille::engine {
namespace {

using Role = StudyTableColumn::Role;

constexpr std::size_t most_lines = 12;

/// Values of y along x, repeats averaged.
struct CurvePoint {
    double x = 0, sum = 0, squares = 0; ///< squares: of the errors
    int count = 0;
    std::size_t level = 0;

    double mean() const { return sum / count; }
    double error() const { return std::sqrt(squares) / count; }
};

std::vector<CurvePoint> curve_of(const StudyView& view, const std::vector<std::size_t>& rows) {
    const StudyAxis& x = view.axes[*view.x];
    std::map<std::size_t, CurvePoint> points;
    for (const std::size_t row : rows) {
        const auto value = view.table.number(row, *view.y);
        if (!value) continue;
        CurvePoint& point = points[x.level[row]];
        point.level = x.level[row];
        point.sum += *value;
        const double error = view.error(row, *view.y);
        point.squares += error * error;
        ++point.count;
    }
    std::vector<CurvePoint> curve;
    for (const auto& [level, point] : points)
        curve.push_back(point);
    return curve;
}

/// What a curve does, judged by its errors: a step counts when it exceeds the errors of its ends.
std::string course_of(const std::vector<CurvePoint>& curve) {
    bool rises = false, falls = false;
    std::size_t low = 0, high = 0; // the extremes so far that later points are held against
    for (std::size_t i = 1; i < curve.size(); ++i) {
        const auto beyond = [&](std::size_t a, std::size_t b) {
            return curve[b].mean() - curve[a].mean() >
                   std::hypot(curve[a].error(), curve[b].error());
        };
        if (beyond(low, i)) {
            rises = true;
            low = high = i;
        } else if (beyond(i, high)) {
            falls = true;
            low = high = i;
        }
        if (curve[i].mean() < curve[low].mean()) low = i;
        if (curve[i].mean() > curve[high].mean()) high = i;
    }
    if (rises && falls) return "rises and falls";
    if (rises) return "rises throughout";
    if (falls) return "falls throughout";
    return curve.size() < 2 ? "one value" : "no change beyond its error";
}

std::string change_table(const StudyView& view) {
    if (!view.y || !view.x || view.axes[*view.x].labels.size() < 2) return "";
    std::vector<std::size_t> shown{*view.x};
    if (view.line) shown.push_back(*view.line);
    const std::vector<StudySlice> slices = study_slices(view, shown, most_lines);
    const StudyAxis& x = view.axes[*view.x];
    struct Change {
        std::string name;
        std::vector<CurvePoint> curve;
    };
    std::vector<Change> changes;
    std::set<std::size_t> starts, ends;
    for (const StudySlice& slice : slices) {
        std::map<std::size_t, std::vector<std::size_t>> lines;
        for (const std::size_t row : slice.rows)
            lines[view.line ? view.axes[*view.line].level[row] : 0].push_back(row);
        for (const auto& [level, rows] : lines) {
            std::string name = view.line ? view.axes[*view.line].value_text(level) : "all";
            if (!slice.name.empty()) name += ", " + slice.name;
            Change change{name, curve_of(view, rows)};
            if (change.curve.size() < 2 || changes.size() >= most_lines) continue;
            starts.insert(change.curve.front().level);
            ends.insert(change.curve.back().level);
            changes.push_back(std::move(change));
        }
    }
    // Where all lines begin and end at the same values, these stand in the head.
    const auto heading = [&](const std::set<std::size_t>& levels, const char* otherwise) {
        return levels.size() == 1 ? "at " + x.value_text(*levels.begin()) : std::string(otherwise);
    };
    DataTable table;
    table.id = "change";
    table.caption = view.y_title() + " over " + x.title;
    table.columns = {{view.line ? view.axes[*view.line].title : "", false, "", true},
                     {heading(starts, "from"), true},
                     {heading(ends, "to"), true},
                     {"change", true},
                     {"course"}};
    const std::string unit = unit_suffix(view.y_unit());
    const auto end_text = [&](const CurvePoint& point, const std::set<std::size_t>& levels) {
        return with_error(point.mean(), point.error()) + unit +
               (levels.size() == 1 ? "" : " at " + x.value_text(point.level));
    };
    for (const Change& change : changes) {
        const CurvePoint &first = change.curve.front(), &last = change.curve.back();
        table.rows.push_back(
            {{change.name},
             {end_text(first, starts)},
             {end_text(last, ends)},
             {with_error(last.mean() - first.mean(), std::hypot(first.error(), last.error())) +
              unit},
             {course_of(change.curve)}});
    }
    if (table.rows.empty()) return "";
    return table_html(table) +
           "<p class=\"soft\">± 95 % sampling errors, combined as root of the sum of squares; grid "
           "error is not in them. A course counts where it goes beyond these errors.</p>\n";
}

std::string counts_html(const StudyView& view) {
    const StudyCounts& c = view.counts;
    std::string html = "<dl class=\"facts counts\"><dt>Points</dt><dd>" + std::to_string(c.points) +
                       (view.plan.empty() ? "" : ", " + escaped(view.plan)) + "</dd>";
    const auto add = [&](const char* word, std::size_t count, const char* meaning) {
        if (count > 0) html += fmt::format("<dt>{}</dt><dd>{}{}</dd>", word, count, meaning);
    };
    add("Done", c.done, "");
    add("Not cleared", c.not_cleared, " (open markers: the result is a bound)");
    add("Clogged", c.clogged, " (an opening closed)");
    add("Failed", c.failed, " (<a href=\"#failures\">reasons</a>)");
    add("Killed", c.killed, " (<a href=\"#failures\">reasons</a>)");
    add("Not run", c.missing(), " (<code>rille study</code> with the same folder goes on)");
    return html + "</dl>\n";
}

std::string targets_html(const StudyView& view) {
    const std::vector<std::size_t> targets = view.table.all(Role::target);
    if (targets.empty()) return "";
    DataTable table;
    table.id = "targets";
    table.columns = {
        {"target on", false, "", true}, {"met", true}, {"missed", true}, {"undecided", true}};
    const auto add = [&](const std::string& name, const std::optional<std::size_t>& column) {
        std::size_t met = 0, missed = 0, undecided = 0;
        for (std::size_t row = 0; row < view.table.rows(); ++row) {
            const std::string verdict =
                column ? std::string(view.table.text(row, *column)) : window_verdict(view, row);
            met += verdict == "met";
            missed += verdict == "missed";
            undecided += verdict == "undecided";
        }
        table.rows.push_back(
            {{name}, {std::to_string(met)}, {std::to_string(missed)}, {std::to_string(undecided)}});
    };
    for (const std::size_t column : targets)
        add(view.metric_name(column), column);
    if (targets.size() > 1) add("all of them", std::nullopt);
    return "<h2>Targets</h2>\n" + table_html(table);
}

std::string list_html(const std::vector<std::string>& items, const std::string& classes) {
    std::string html = "<ul class=\"" + classes + "\">";
    for (const std::string& item : items)
        html += "<li>" + escaped(item) + "</li>";
    return html + "</ul>\n";
}

std::string nothing_html(const StudyView& view) {
    if (view.table.rows() == 0)
        return "<p class=\"outcome\">No point of this study has been run yet, so there is nothing "
               "to show.</p>\n";
    if (!view.y)
        return "<p class=\"outcome\">The study asks for no curve, or for a quantity that no point "
               "has; all values are in the table of points.</p>\n";
    return "<p class=\"outcome\">No point has a value of " + escaped(view.y_title()) +
           ", so there is no curve; what became of the points is told below.</p>\n";
}

} // namespace

std::string constants_html(const StudyView& view) {
    if (view.table.constants.empty()) return "";
    return "<div class=\"constants\"><h3>What stays constant</h3>" +
           list_html(view.table.constants, "") + "</div>\n";
}

std::string study_summary_html(const StudyParts& p) {
    const StudyView& view = p.view;
    const MeasuredRows measured = measured_rows(view);
    std::vector<SliceFigure> figures;
    for (const auto& [name, chart] : answer_charts(view, measured)) {
        const bool any = std::any_of(chart.lines.begin(), chart.lines.end(),
                                     [](const ChartLine& line) { return !line.points.empty(); });
        if (!any) continue;
        figures.push_back(p.show(
            name, chart, "The curve that the study asks for. A marker shows its point's profile."));
    }
    std::string html = "<div class=\"answer\">\n<div>\n" +
                       (figures.empty() ? nothing_html(view)
                                        : slices_html("answer-choice", "Shown for", figures)) +
                       "</div>\n<div>\n<h2>How the points ended</h2>\n" + counts_html(view);
    if (!measured.problem.empty())
        html += "<p class=\"warning\">Measured rows are not shown: " + escaped(measured.problem) +
                ".</p>\n";
    if (measured.unmatched > 0)
        html +=
            fmt::format("<p class=\"warning\">{} measured row{} to no point of the study.</p>\n",
                        measured.unmatched, measured.unmatched == 1 ? " belongs" : "s belong");
    html += targets_html(view) + constants_html(view);
    if (!view.table.warnings.empty())
        html += "<h3>Warnings</h3>" + list_html(view.table.warnings, "warning");
    html += "<p>" + escaped(view.caution) + "</p>\n<p class=\"caution\">" + escaped(caution) +
            "</p>\n</div>\n</div>\n";
    return html + change_table(view);
}

PageSection about_section(const StudyParts& p) {
    const StudyView& view = p.view;
    PageSection section{"about", "What the numbers mean", "", true};
    DataTable table;
    table.id = "definitions";
    table.columns = {{"quantity", false, "", true}, {"unit"}, {"definition"}};
    for (const std::size_t column : view.table.all(Role::metric)) {
        const StudyTableColumn& c = view.table.columns[column];
        table.rows.push_back({{view.metric_name(column)}, {c.unit}, {c.definition}});
    }
    section.html =
        constants_html(view) +
        "<p>Errors are 95 % sampling errors (half widths). The error of the grid and the "
        "uncertainty of the parameters are not assessed in a study.</p>\n" +
        table_html(table);
    return section;
}

} // namespace rille::engine
