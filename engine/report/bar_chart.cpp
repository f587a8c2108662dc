// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_frame.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

/// One row: name, bar from zero, its error and its text.
struct BarRows {
    double names = 0, texts = 0; ///< widths of the columns
    double row = 0;
};

BarRows lay_rows(const BarChart& chart, const Sheet& sheet) {
    BarRows rows;
    const TextStyle style = sheet.body();
    for (const Bar& bar : chart.bars) {
        rows.names = std::max(rows.names, text_width(bar.name, style));
        rows.texts = std::max(rows.texts, text_width(bar.text, style));
    }
    rows.names = std::min(rows.names, 0.36 * sheet.room.width);
    rows.texts = std::min(rows.texts, 0.28 * sheet.room.width);
    rows.row = 1.9 * style.size;
    return rows;
}

void draw_rows(Svg& svg, const BarChart& chart, const Sheet& sheet, const BarRows& rows,
               const PlotFrame& frame) {
    const TextStyle style = sheet.body();
    const LineLook look = line_look(4);
    const double step =
        frame.plot.height / static_cast<double>(std::max<std::size_t>(chart.bars.size(), 1));
    for (std::size_t i = 0; i < chart.bars.size(); ++i) {
        const Bar& bar = chart.bars[i];
        const double middle = frame.plot.y + (static_cast<double>(i) + 0.5) * step;
        const double half = std::min(0.36 * step, 0.8 * style.size);
        const double zero = frame.x.px(0), end = frame.x.px(bar.value);
        svg.text(frame.plot.x - 0.6 * style.size, middle + 0.35 * style.size,
                 shortened(bar.name, style, rows.names), sheet.body(Anchor::end));
        svg.rect({std::min(zero, end), middle - half, std::fabs(end - zero), 2 * half},
                 "class=\"share\" fill=\"" + look.colour + "\"");
        if (bar.upper() > bar.lower()) {
            const double low = frame.x.px(bar.lower()), high = frame.x.px(bar.upper()),
                         cap = 0.6 * half;
            svg.path(path_data({{low, middle}, {high, middle}}, false) +
                         path_data({{low, middle - cap}, {low, middle + cap}}, false) +
                         path_data({{high, middle - cap}, {high, middle + cap}}, false),
                     fmt::format("class=\"bar\" fill=\"none\" stroke=\"#111111\" "
                                 "stroke-width=\"{}\"",
                                 px(0.7 * sheet.size.line)));
        }
        svg.text(frame.plot.x + frame.plot.width + 0.6 * style.size, middle + 0.35 * style.size,
                 shortened(bar.text, style, rows.texts), style);
    }
    svg.line(frame.x.px(0), frame.plot.y, frame.x.px(0), frame.plot.y + frame.plot.height,
             fmt::format("stroke=\"#333333\" stroke-width=\"{}\"", px(0.6 * sheet.size.line)));
}

} // namespace

std::string chart_svg(const BarChart& chart, FigureForm form) {
    Sheet sheet = lay_sheet(chart.text, form, 0);
    const BarRows rows = lay_rows(chart, sheet);
    const double count = static_cast<double>(std::max<std::size_t>(chart.bars.size(), 1));
    sheet = lay_sheet(chart.text, form, count * rows.row + frame_margins(sheet));
    DataRange values;
    values.add(0);
    for (const Bar& bar : chart.bars) {
        values.add(bar.value);
        values.add(bar.lower());
        values.add(bar.upper());
    }
    Box area = sheet.room;
    area.x += rows.names;
    area.width -= rows.names + rows.texts + sheet.size.body;
    const std::size_t bars = chart.bars.size();
    if (form == FigureForm::slide) // a few bars do not grow to fill the sheet
        area.height = std::min(area.height, (static_cast<double>(std::max<std::size_t>(bars, 1))) *
                                                    3.4 * sheet.size.body +
                                                frame_margins(sheet));
    ChartAxis across, none;
    across.title = chart.axis_title;
    across.from_zero = true;
    none.words = {""};
    const PlotFrame frame = lay_frame(sheet, area, across, none, values, DataRange{});
    Svg svg = start_sheet(sheet, chart.text);
    draw_frame(svg, sheet, frame);
    draw_rows(svg, chart, sheet, rows, frame);
    return svg.finish();
}

} // namespace rille::engine
