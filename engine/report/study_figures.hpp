// SPDX-License-Identifier: Apache-2.0
// The figures of a study: its curve, maps over two axes, process window, profiles along an axis.
#pragma once

#include "engine/report/page.hpp"
#include "engine/report/study_measured.hpp"
#include "engine/report/study_view.hpp"

#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// One figure of several that show the same for different slices of the plan.
struct SliceFigure {
    std::string name; ///< of the slice; empty where there is one
    Figure figure;
};

/// The curve that is asked for: y against x, one line for each value of `line`, a slice for each
/// combination of further axes. Where the plan is no grid the points stand alone, unjoined.
std::vector<std::pair<std::string, LineChart>> answer_charts(const StudyView&, const MeasuredRows&);
/// Columns of the metrics that the curve and the targets are about, each once.
std::vector<std::size_t> asked_metrics(const StudyView&, std::size_t most);
/// A metric against each axis that is varied freely, every point on its own.
std::vector<LineChart> scatter_charts(const StudyView&, std::size_t metric_column);
/// The metric that is asked for, or `metric_column`, over two axes of the plan.
std::vector<std::pair<std::string, HeatMap>> metric_maps(const StudyView&,
                                                         std::size_t metric_column);
/// Verdicts on a target (a column of the table), or on all of them together, over two axes.
std::vector<std::pair<std::string, HeatMap>>
window_maps(const StudyView&, const std::optional<std::size_t>& target_column);
/// The two axes that maps are drawn over, indices into axes; fewer where the study has fewer.
std::vector<std::size_t> map_axes(const StudyView&);
/// Met if all targets are met, missed if one is missed, else undecided; empty without result.
std::string window_verdict(const StudyView&, std::size_t row);

/// A chart as a figure of the page, in all its forms.
template <class Chart>
Figure figure_of(const Chart& chart, const std::string& caption) {
    Figure figure;
    figure.id = chart.text.id;
    figure.svg = chart_svg(chart, FigureForm::page);
    figure.narrow = chart_svg(chart, FigureForm::narrow);
    figure.slide = chart_svg(chart, FigureForm::slide);
    figure.caption = caption;
    figure.least_width = 340;
    return figure;
}

/// Figures of which one is shown at a time where scripts run: a choice above them.
std::string slices_html(const std::string& id, const std::string& label,
                        const std::vector<SliceFigure>&);
/// The same for anything, as pairs of a name and its HTML, one element each.
std::string choice_html(const std::string& id, const std::string& label,
                        const std::vector<std::pair<std::string, std::string>>& parts);
/// A figure as small as on a narrow screen, for several side by side.
template <class Chart>
Figure small_figure_of(const Chart& chart, const std::string& caption) {
    Figure figure = figure_of(chart, caption);
    figure.svg = std::move(figure.narrow);
    figure.narrow.clear();
    figure.least_width = 280;
    return figure;
}

} // namespace rille::engine
