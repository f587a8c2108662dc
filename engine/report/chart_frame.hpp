// SPDX-License-Identifier: Apache-2.0
// Internal to the figures: a plot with two axes on a sheet.
#pragma once

#include "engine/report/chart_parts.hpp"

namespace rille::engine {

/// A plot area between its axes.
struct PlotFrame {
    Box plot;
    AxisScale x, y;
    std::array<double, 2> at(double vx, double vy) const { return {x.px(vx), y.px(vy)}; }
};

/// Sets both axes into `area`; `y_to_ticks` moves the ends of y out to ticks. Room for the labels
/// is taken from the area.
PlotFrame lay_frame(const Sheet&, const Box& area, const ChartAxis& x, const ChartAxis& y,
                    const DataRange& x_data, const DataRange& y_data, bool y_to_ticks = true);
/// Grid, labels, titles and the frame itself.
void draw_frame(Svg&, const Sheet&, const PlotFrame&);
/// Height that the labels and titles of both axes take.
double frame_margins(const Sheet&);

} // namespace rille::engine
