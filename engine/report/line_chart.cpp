// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_frame.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

double plot_height(FigureForm form) {
    return form == FigureForm::narrow ? 260 : 360;
}

struct DrawnLine {
    const ChartLine* line;
    LineLook look;
    std::vector<const ChartPoint*> points; ///< those that can be drawn
};

class LineDrawing {
public:
    LineDrawing(const LineChart& chart, FigureForm form) : chart_(chart) {
        for (std::size_t i = 0; i < chart.lines.size(); ++i) {
            const ChartLine& line = chart.lines[i];
            lines_.push_back({&line, line_look(line.look.value_or(i)), {}});
            for (const ChartPoint& p : line.points)
                if (drawable(chart.x, p.x) && drawable(chart.y, p.y))
                    lines_.back().points.push_back(&p);
            if (!line.name.empty())
                legend_.push_back({line.name, lines_.back().look, line.is_joined,
                                   line.has_markers || !line.is_joined, line.is_measured});
        }
        lay(form);
    }

    std::string draw() {
        Svg svg = start_sheet(sheet_, chart_.text);
        draw_frame(svg, sheet_, frame_);
        draw_levels(svg);
        for (const DrawnLine& line : lines_)
            draw_joined(svg, line);
        for (const DrawnLine& line : lines_)
            for (const ChartPoint* p : line.points)
                draw_bar(svg, line, *p);
        for (const DrawnLine& line : lines_)
            draw_markers(svg, line);
        if (beside_ > 0)
            draw_labels(svg);
        else
            draw_legend(&svg, sheet_, legend_, sheet_.room.x, sheet_.room.y + 4, sheet_.room.width);
        return svg.finish();
    }

private:
    static bool drawable(const ChartAxis& axis, double value) {
        return std::isfinite(value) && (!axis.logarithmic || value > 0);
    }

    void lay(FigureForm form) {
        sheet_ = lay_sheet(chart_.text, form, 0);
        beside_ = label_column(form);
        const double above =
            beside_ > 0 ? 0 : draw_legend(nullptr, sheet_, legend_, 0, 0, sheet_.room.width);
        sheet_ = lay_sheet(chart_.text, form, plot_height(form) + above + frame_margins(sheet_));
        Box area = sheet_.room;
        area.y += above + (above > 0 ? 4 : 0);
        area.height -= above + (above > 0 ? 4 : 0);
        area.width -= beside_ > 0 ? beside_ : sheet_.size.body;
        DataRange x, y;
        for (const DrawnLine& line : lines_)
            for (const ChartPoint* p : line.points) {
                x.add(p->x);
                for (const double v : {p->y - p->error, p->y, p->y + p->error})
                    if (drawable(chart_.y, v)) y.add(v);
            }
        for (const auto& level : chart_.levels)
            if (drawable(chart_.y, level.first)) y.add(level.first);
        frame_ = lay_frame(sheet_, area, chart_.x, chart_.y, x, y);
    }

    /// Width of the column of names beside the plot; 0 where they stand above it instead.
    double label_column(FigureForm form) const {
        if (form == FigureForm::narrow || legend_.size() < 2) return 0;
        const TextStyle style = sheet_.body();
        double widest = 0;
        for (const LegendEntry& entry : legend_)
            widest = std::max(widest, text_width(entry.name, style));
        const double height = form == FigureForm::slide ? 500 : plot_height(form);
        const bool fits = widest < 0.22 * sheet_.width &&
                          1.5 * style.size * static_cast<double>(legend_.size()) < height;
        return fits ? widest + 5.2 * style.size : 0;
    }

    void draw_levels(Svg& svg) {
        TextStyle style = sheet_.small();
        style.halo = true;
        for (const auto& [value, name] : chart_.levels) {
            if (!drawable(chart_.y, value)) continue;
            const double y = frame_.y.px(value);
            svg.line(
                frame_.plot.x, y, frame_.plot.x + frame_.plot.width, y,
                fmt::format("stroke=\"#222222\" stroke-width=\"{}\" stroke-dasharray=\"{} {}\"",
                            px(0.6 * sheet_.size.line), px(4 * sheet_.size.line),
                            px(2.5 * sheet_.size.line)));
            svg.text(frame_.plot.x + 0.5 * style.size, y - 0.35 * style.size,
                     shortened(name, style, frame_.plot.width - style.size), style);
        }
    }

    void draw_joined(Svg& svg, const DrawnLine& line) {
        if (!line.line->is_joined || line.line->is_measured || line.points.size() < 2) return;
        std::vector<std::array<double, 2>> points;
        for (const ChartPoint* p : line.points)
            points.push_back(frame_.at(p->x, p->y));
        svg.path(path_data(points, false),
                 "fill=\"none\" " + line_stroke(line.look, sheet_.size.line));
    }

    void draw_bar(Svg& svg, const DrawnLine& line, const ChartPoint& p) {
        if (!(p.error > 0)) return;
        const auto y_at = [&](double v) {
            if (!drawable(chart_.y, v)) return frame_.y.start;
            return std::clamp(frame_.y.px(v), frame_.y.end, frame_.y.start);
        };
        const double x = frame_.x.px(p.x), low = y_at(p.y - p.error), high = y_at(p.y + p.error);
        const double cap = (line.line->is_measured ? 1.7 : 0.8) * sheet_.size.marker;
        svg.path(path_data({{x, low}, {x, high}}, false) +
                     path_data({{x - cap, low}, {x + cap, low}}, false) +
                     path_data({{x - cap, high}, {x + cap, high}}, false),
                 fmt::format("class=\"bar\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\"",
                             line.look.colour, px(0.7 * sheet_.size.line)));
    }

    void draw_markers(Svg& svg, const DrawnLine& line) {
        const double r = sheet_.size.marker;
        for (const ChartPoint* p : line.points) {
            const bool is_shown = line.line->has_markers || !line.line->is_joined || p->is_open;
            if (!is_shown) continue;
            const auto at = frame_.at(p->x, p->y);
            svg.raw(open_group(p->key, p->words));
            if (!p->key.empty())
                svg.raw("<circle cx=\"" + px(at[0]) + "\" cy=\"" + px(at[1]) + "\" r=\"" +
                        px(1.9 * r) + "\" fill=\"#ffffff\" fill-opacity=\"0\"/>");
            const std::string move =
                fmt::format(" transform=\"translate({} {})\"", px(at[0]), px(at[1]));
            if (line.line->is_measured) {
                const std::string cross =
                    path_data({{-r, -r}, {r, r}}, false) + path_data({{-r, r}, {r, -r}}, false);
                svg.path(cross,
                         fmt::format("fill=\"none\" stroke=\"#ffffff\" stroke-width=\"{}\"{}",
                                     px(2.8 * sheet_.size.line), move));
                svg.path(cross, fmt::format("fill=\"none\" stroke=\"{}\" stroke-width=\"{}\"{}",
                                            line.look.colour, px(1.2 * sheet_.size.line), move));
            } else {
                svg.path(
                    marker_path(line.look.marker, p->is_open ? 1.15 * r : r),
                    fmt::format("class=\"mark\" fill=\"{}\" stroke=\"{}\" stroke-width=\"{}\"{}",
                                p->is_open ? "#ffffff" : line.look.colour, line.look.colour,
                                px((p->is_open ? 0.9 : 0.3) * sheet_.size.line), move));
            }
            svg.raw(close_group());
        }
    }

    /// Names beside the right ends of their lines.
    void draw_labels(Svg& svg) {
        const TextStyle style = sheet_.body();
        std::vector<double> wanted;
        std::vector<std::array<double, 2>> ends;
        for (const DrawnLine& line : lines_) {
            if (line.line->name.empty()) continue;
            std::array<double, 2> end{frame_.plot.x + frame_.plot.width,
                                      frame_.plot.y + frame_.plot.height};
            bool any = false;
            for (const ChartPoint* p : line.points) {
                const auto at = frame_.at(p->x, p->y);
                if (!any || at[0] > end[0]) end = at;
                any = true;
            }
            ends.push_back(end);
            wanted.push_back(end[1]);
        }
        const std::vector<double> places =
            spread(wanted, 1.5 * style.size, frame_.plot.y + 0.5 * style.size,
                   frame_.plot.y + frame_.plot.height - 0.5 * style.size);
        const double x = frame_.plot.x + frame_.plot.width + 1.5 * style.size;
        for (std::size_t i = 0; i < places.size(); ++i) {
            if (!legend_[i].is_measured)
                svg.path(path_data({{ends[i][0] + 1.6 * sheet_.size.marker, ends[i][1]},
                                    {x - 0.4 * style.size, places[i]}},
                                   false),
                         fmt::format("fill=\"none\" stroke=\"{}\" stroke-opacity=\"0.45\" "
                                     "stroke-width=\"{}\"",
                                     legend_[i].look.colour, px(0.4 * sheet_.size.line)));
            draw_swatch(svg, sheet_, legend_[i], x, places[i], 2.6 * style.size);
            svg.text(x + 3.1 * style.size, places[i] + 0.35 * style.size, legend_[i].name, style);
        }
    }

    const LineChart& chart_;
    std::vector<DrawnLine> lines_;
    std::vector<LegendEntry> legend_;
    Sheet sheet_;
    PlotFrame frame_;
    double beside_ = 0;
};

} // namespace

std::string chart_svg(const LineChart& chart, FigureForm form) {
    return LineDrawing(chart, form).draw();
}

} // namespace rille::engine
