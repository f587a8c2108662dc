// SPDX-License-Identifier: Apache-2.0
#include "engine/number_text.hpp"
#include "engine/report/study_figures.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>

namespace rille::engine {
namespace {

constexpr std::size_t most_slices = 12, most_lines = 16, most_groups = 8, most_markers = 1500;

class CurveMaker {
public:
    CurveMaker(const StudyView& view, const MeasuredRows& measured, bool is_joined)
        : view_(view), measured_(measured), x_(view.axes[*view.x]), joined_(is_joined) {}

    LineChart chart(const StudySlice& slice, const std::string& id) {
        LineChart chart;
        const std::string title = view_.y_title() + " against " + x_.title;
        chart.text = view_.figure_text(id, slice.name.empty() ? title : title + ", " + slice.name);
        // In a plan that is no grid hardly two points share a value: then there are no lines.
        by_line_ = view_.line && (joined_ || view_.axes[*view_.line].labels.size() <= most_groups);
        if (by_line_)
            chart.text.subtitle += " · one line for each " + view_.axes[*view_.line].title;
        chart.x = x_.chart_axis();
        chart.y.title = view_.y_title();
        chart.y.unit = view_.y_unit();
        std::map<std::size_t, std::vector<std::size_t>> lines;
        for (const std::size_t row : slice.rows)
            lines[by_line_ ? view_.axes[*view_.line].level[row] : 0].push_back(row);
        const std::size_t every = (lines.size() + most_lines - 1) / most_lines;

        stride_ = std::max<std::size_t>(1, slice.rows.size() / most_markers);
        std::size_t index = 0;
        for (const auto& [level, rows] : lines) {
            if (index++ % every != 0) continue;
            add_line(chart, level, rows);
        }
        add_notes(chart, slice, every > 1 ? lines.size() : 0);
        return chart;
    }

private:
    void add_line(LineChart& chart, std::size_t level, const std::vector<std::size_t>& rows) {
        const std::size_t look = look_++;
        std::map<double, std::pair<double, int>> means; // sum and number of repeats
        ChartLine points;
        points.is_joined = false;
        points.look = look;
        for (std::size_t i = 0; i < rows.size(); ++i) {
            const std::size_t row = rows[i];
            const auto value = view_.table.number(row, *view_.y);
            if (!value) continue;
            const double x = x_.place(row);
            means[x].first += *value;
            ++means[x].second;
            if (i % stride_ != 0) continue;
            points.points.push_back({x, *value, view_.error(row, *view_.y), view_.is_open(row),
                                     std::to_string(row), view_.words(row)});
            any_open_ = any_open_ || view_.is_open(row);
            any_error_ = any_error_ || view_.error(row, *view_.y) > 0;
        }
        const std::string name = by_line_ ? view_.axes[*view_.line].value_text(level) : "";
        ChartLine line;
        line.name = name;
        line.look = look;
        for (const auto& [x, mean] : means)
            line.points.push_back({x, mean.first / mean.second, 0, false, "", ""});
        // Repeats: the line runs through their means, each of them has its own marker.
        const bool repeated = line.points.size() != points.points.size() && stride_ == 1;
        any_repeats_ = any_repeats_ || (joined_ && repeated);
        if (!joined_) {
            points.name = name;
        } else if (!repeated && stride_ == 1) {
            points.name = name;
            points.is_joined = true;
            std::stable_sort(points.points.begin(), points.points.end(),
                             [](const ChartPoint& a, const ChartPoint& b) { return a.x < b.x; });
        } else {
            line.has_markers = false;
            chart.lines.push_back(line);
        }
        chart.lines.push_back(points);
        add_measured(chart, rows, look, name);
    }

    void add_measured(LineChart& chart, const std::vector<std::size_t>& rows, std::size_t look,
                      const std::string& name) {
        ChartLine line;
        line.name = name.empty() ? "measured" : name + ", measured";
        line.is_measured = true;
        line.look = look;
        for (const MeasuredRow& m : measured_.rows) {
            const auto here =
                std::find_first_of(m.rows.begin(), m.rows.end(), rows.begin(), rows.end());
            if (here == m.rows.end()) continue;
            line.points.push_back({x_.place(*here), m.value, m.sigma.value_or(0), false, "",
                                   "measured: " + with_error(m.value, m.sigma.value_or(0)) +
                                       unit_suffix(view_.y_unit())});
        }
        if (line.points.empty()) return;
        any_measured_ = true;
        chart.lines.push_back(line);
    }

    void add_notes(LineChart& chart, const StudySlice& slice, std::size_t all_lines) const {
        std::vector<std::string>& notes = chart.text.notes;
        std::string marks = any_error_ ? "Bars: 95 % sampling error; grid error is not in them."
                                       : "No sampling error; grid error is not assessed.";
        if (any_open_) marks += " Open markers: not cleared or clogged, so the value is a bound.";
        if (any_repeats_) marks += " Lines run through the means of repeats.";
        if (any_measured_) marks += " Crosses: measured, bars one sigma over the sites.";
        notes.push_back(marks);
        std::string without;
        std::size_t count = 0;
        for (const std::size_t row : slice.rows)
            if (!view_.table.number(row, *view_.y) && ++count <= 8)
                without += (without.empty() ? "" : ", ") + view_.point(row) +
                           (view_.is_open(row) ? " (" + view_.status(row) + ")" : "");
        if (count > 0)
            notes.push_back(fmt::format("No value from {} point{}: {}{}.", count,
                                        count == 1 ? "" : "s", without, count > 8 ? " ..." : ""));
        if (!joined_)
            notes.push_back("The plan is no grid: the points differ in other inputs too, so they "
                            "are not joined.");
        if (stride_ > 1) notes.push_back(fmt::format("One marker for every {} points.", stride_));
        if (all_lines > 0)
            notes.push_back(fmt::format("A part of the {} lines is drawn.", all_lines));
    }

    const StudyView& view_;
    const MeasuredRows& measured_;
    const StudyAxis& x_;
    bool joined_, by_line_ = false;
    std::size_t look_ = 0, stride_ = 1;
    bool any_open_ = false, any_error_ = false, any_repeats_ = false, any_measured_ = false;
};

} // namespace

std::vector<std::pair<std::string, LineChart>> answer_charts(const StudyView& view,
                                                             const MeasuredRows& measured) {
    std::vector<std::pair<std::string, LineChart>> charts;
    if (!view.y || !view.x) return charts;
    std::vector<std::size_t> shown{*view.x};
    if (view.line) shown.push_back(*view.line);
    std::vector<StudySlice> slices = study_slices(view, shown, most_slices);
    const bool is_grid = !slices.empty();
    if (!is_grid) slices = {whole_study(view)};
    for (const StudySlice& slice : slices) {
        const std::string id =
            charts.empty() ? "answer" : "answer-" + std::to_string(charts.size() + 1);
        charts.emplace_back(slice.name, CurveMaker(view, measured, is_grid).chart(slice, id));
    }
    return charts;
}

} // namespace rille::engine
