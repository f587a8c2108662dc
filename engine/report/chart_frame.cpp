// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_frame.hpp"

#include <algorithm>
#include <fmt/format.h>

namespace rille::engine {
namespace {

double title_room(const Sheet& sheet) {
    return 2.1 * sheet.size.body;
}
double label_room(const Sheet& sheet) {
    return 1.6 * sheet.size.body;
}

double widest_label(const AxisScale& scale, const TextStyle& style) {
    double widest = 0;
    for (const std::string& label : scale.labels)
        widest = std::max(widest, text_width(label, style));
    return widest;
}

/// Whether neighbouring labels of a level axis keep apart.
bool fits(const AxisScale& scale, const TextStyle& style) {
    for (std::size_t i = 1; i < scale.ticks.size(); ++i) {
        const double apart = scale.px(scale.ticks[i]) - scale.px(scale.ticks[i - 1]);
        const double need =
            0.5 * (text_width(scale.labels[i], style) + text_width(scale.labels[i - 1], style)) +
            0.7 * style.size;
        if (apart < need) return false;
    }
    return true;
}

} // namespace

double frame_margins(const Sheet& sheet) {
    return 2 * title_room(sheet) + label_room(sheet);
}

PlotFrame lay_frame(const Sheet& sheet, const Box& area, const ChartAxis& x, const ChartAxis& y,
                    const DataRange& x_data, const DataRange& y_data, bool y_to_ticks) {
    PlotFrame frame;
    const TextStyle style = sheet.body();
    frame.plot.y = area.y + title_room(sheet);
    frame.plot.height = area.height - frame_margins(sheet);
    const auto most_y =
        static_cast<std::size_t>(std::clamp(frame.plot.height / (2.6 * style.size), 2.0, 8.0));
    frame.y = make_scale(y, y_data, most_y, y_to_ticks);
    frame.y.start = frame.plot.y + frame.plot.height;
    frame.y.end = frame.plot.y;
    const double left = std::min(widest_label(frame.y, style), 0.3 * area.width) + 0.7 * style.size;
    frame.plot.x = area.x + left;
    frame.plot.width = area.width - left;
    for (std::size_t most = x.words.empty() ? 10 : x.words.size(); most > 0; --most) {
        frame.x = make_scale(x, x_data, most, false);
        frame.x.start = frame.plot.x;
        frame.x.end = frame.plot.x + frame.plot.width;
        if (fits(frame.x, style)) break;
    }
    for (std::string& label : frame.x.labels)
        label = shortened(label, style, 0.9 * frame.plot.width);
    return frame;
}

void draw_frame(Svg& svg, const Sheet& sheet, const PlotFrame& frame) {
    const Box& plot = frame.plot;
    const TextStyle body = sheet.body(), right = sheet.body(Anchor::end);
    const std::string grid =
        fmt::format("stroke=\"#dedede\" stroke-width=\"{}\"", px(0.45 * sheet.size.line));
    const double right_edge = sheet.width - 0.3 * sheet.size.margin;
    for (std::size_t i = 0; i < frame.x.ticks.size(); ++i) {
        const double at = frame.x.px(frame.x.ticks[i]);
        const double half = 0.5 * text_width(frame.x.labels[i], body);
        svg.line(at, plot.y, at, plot.y + plot.height, grid);
        svg.text(std::clamp(at, half, std::max(half, right_edge - half)),
                 plot.y + plot.height + 1.25 * body.size, frame.x.labels[i],
                 sheet.body(Anchor::middle));
    }
    for (std::size_t i = 0; i < frame.y.ticks.size(); ++i) {
        if (frame.y.labels[i].empty()) continue;
        const double at = frame.y.px(frame.y.ticks[i]);
        svg.line(plot.x, at, plot.x + plot.width, at, grid);
        svg.text(plot.x - 0.5 * body.size, at + 0.35 * body.size,
                 shortened(frame.y.labels[i], body, plot.x - sheet.room.x), right);
    }
    if (!frame.y.logarithmic && !frame.y.is_words && frame.y.low < 0 && frame.y.high > 0)
        svg.line(plot.x, frame.y.px(0), plot.x + plot.width, frame.y.px(0),
                 fmt::format("stroke=\"#777777\" stroke-width=\"{}\"", px(0.5 * sheet.size.line)));
    svg.rect(plot, fmt::format("fill=\"none\" stroke=\"#333333\" stroke-width=\"{}\"",
                               px(0.55 * sheet.size.line)));
    const TextStyle up = fitting(frame.y.title, body, sheet.room.width, 6);
    if (!frame.y.title.empty())
        svg.text(sheet.room.x, plot.y - 0.85 * body.size, frame.y.title, up);
    TextStyle across =
        fitting(frame.x.title, sheet.body(Anchor::middle), sheet.width - sheet.size.margin, 6);
    const double half = 0.5 * text_width(frame.x.title, across);
    svg.text(std::clamp(plot.x + 0.5 * plot.width, half + 2, sheet.width - half - 2),
             plot.y + plot.height + 2.85 * body.size, frame.x.title, across);
}

} // namespace rille::engine
