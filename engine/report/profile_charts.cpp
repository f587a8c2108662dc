// SPDX-License-Identifier: Apache-2.0
#include "engine/picture_parts.hpp"
#include "engine/report/chart_frame.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

/// Extent of everything that is drawn, with a little air.
struct Extent {
    DataRange x, z;
    double width() const { return x.high - x.low; }
    double height() const { return z.high - z.low; }
};

Extent extent_of(const std::vector<ProfileOutline>& outlines, const Section& before) {
    Extent e;
    add_extent(before, e.x, e.z);
    for (const ProfileOutline& outline : outlines)
        add_extent(outline.lines, e.x, e.z);
    if (!e.x.any) {
        for (const double v : {-50.0, 50.0})
            e.x.add(v);
        for (const double v : {-100.0, 0.0})
            e.z.add(v);
    }
    if (!(e.width() > 0)) e.x.add(e.x.low + 1);
    const double air = 0.06 * std::max(e.height(), 0.2 * e.width());
    e.z.add(e.z.low - air);
    e.z.add(e.z.high + air);
    return e;
}

/// Whole factor by which widths are stretched so that a section is at least `least` px wide.
double stretch_for(double width_px, double least) {
    return width_px < 0.7 * least ? std::ceil(least / width_px - 1e-9) : 1;
}

std::string stretch_note(double stretch) {
    return fmt::format("Widths are drawn at {:.0f} times the scale of depths.", stretch);
}

/// The solid under an outline: its open lines closed along the lower edge, its voids cut out.
std::string solid_path(const Section& section, const SectionView& view, double floor_px) {
    std::string data;
    for (const SectionLine& line : section) {
        if (line.points.size() < 2) continue;
        std::vector<std::array<double, 2>> points = line.points;
        for (auto& p : points)
            p = view.at(p);
        if (!line.closed) {
            points.push_back({points.back()[0], floor_px});
            points.push_back({points.front()[0], floor_px});
        }
        data += path_data(points, true);
    }
    return data;
}

std::string dashed(double width) {
    return fmt::format("fill=\"none\" stroke=\"#777777\" stroke-width=\"{}\" "
                       "stroke-dasharray=\"{} {}\"",
                       px(width), px(5 * width), px(3 * width));
}

/// The panels of a row: how many a line, how large, and to which scale.
struct PanelGrid {
    std::size_t columns = 1, rows = 1;
    double step_x = 0, width = 0, height = 0, scale_x = 1, scale_z = 1, stretch = 1;
    double text = 0; ///< height of name and note together
};

class RowDrawing {
public:
    RowDrawing(const ProfileRow& row, FigureForm form)
        : row_(row), text_(row.text), extent_(extent_of(row.panels, row.before)) {
        sheet_ = lay_sheet(text_, form, 0);
        lay_grid(form, form == FigureForm::slide ? sheet_.room.height : 0);
        if (grid_.stretch > 1) text_.notes.push_back(stretch_note(grid_.stretch));
        sheet_ = lay_sheet(text_, form, head() + rows_height() + scale_room());
        if (form == FigureForm::slide) lay_grid(form, sheet_.room.height);
    }

    std::string draw() {
        Svg svg = start_sheet(sheet_, text_);
        svg.define("<pattern id=\"" + text_.id +
                   "-failed\" width=\"10\" height=\"10\" patternUnits=\"userSpaceOnUse\"><path "
                   "d=\"M0 10L10 0M0 0L10 10\" stroke=\"#444444\" stroke-width=\"0.8\" "
                   "stroke-opacity=\"0.5\" fill=\"none\"/></pattern>");
        const double body = sheet_.size.body;
        svg.text(sheet_.room.x, sheet_.room.y + 1.2 * body,
                 shortened(row_.axis_title, sheet_.body(), sheet_.room.width), sheet_.body());
        for (std::size_t i = 0; i < row_.panels.size(); ++i)
            draw_panel(svg, row_.panels[i],
                       sheet_.room.x + static_cast<double>(i % grid_.columns) * grid_.step_x,
                       sheet_.room.y + head() +
                           static_cast<double>(i / grid_.columns) * (grid_.height + grid_.text));
        draw_scale(svg);
        return svg.finish();
    }

private:
    double head() const { return 1.9 * sheet_.size.body; }
    double scale_room() const { return 2 * sheet_.size.body; }
    double rows_height() const {
        return static_cast<double>(grid_.rows) * (grid_.height + grid_.text);
    }

    void lay_grid(FigureForm form, double room_height) {
        const double body = sheet_.size.body;
        grid_.text = 3.4 * body;
        const std::size_t count = std::max<std::size_t>(row_.panels.size(), 1);
        double names = 5 * body;
        for (const ProfileOutline& panel : row_.panels)
            names = std::max({names, text_width(panel.name, sheet_.body()),
                              text_width(panel.note, sheet_.small())});
        names = std::min(names, 14 * body) + body;
        const auto most = static_cast<std::size_t>(std::max(1.0, sheet_.room.width / names));
        const std::size_t least_rows = (count + most - 1) / most;
        PanelGrid best;
        // More rows than needed can give larger panels on a sheet of fixed height.
        for (std::size_t rows = least_rows; rows <= least_rows + (room_height > 0 ? 2 : 0);
             ++rows) {
            PanelGrid g = grid_;
            g.rows = rows;
            g.columns = std::min(most, (count + rows - 1) / rows);
            const double limit =
                room_height > 0
                    ? (room_height - head() - scale_room()) / static_cast<double>(rows) - g.text
                    : (form == FigureForm::narrow ? 190 : 230);
            g.step_x =
                sheet_.room.width /
                static_cast<double>(std::max<std::size_t>(g.columns, room_height > 0 ? 1 : 3));
            g.scale_z = std::min((g.step_x - 0.8 * body) / extent_.width(),
                                 std::max(limit, 10.0) / extent_.height());
            g.stretch = stretch_for(extent_.width() * g.scale_z, 3 * body);
            g.scale_x = g.scale_z * g.stretch;
            g.width = extent_.width() * g.scale_x;
            g.height = extent_.height() * g.scale_z;
            g.step_x = std::min(g.step_x, std::max(g.width + 1.2 * body, names));
            if (best.width == 0 || g.scale_z > 1.05 * best.scale_z) best = g;
        }
        grid_ = best;
    }

    void draw_panel(Svg& svg, const ProfileOutline& panel, double x, double y) {
        const double body = sheet_.size.body, room = grid_.step_x - 0.4 * body;
        svg.raw(open_group(panel.key, panel.words));
        const Box frame{x, y, grid_.width, grid_.height};
        svg.rect(frame, "class=\"panel\" fill=\"#ffffff\"");
        const SectionView view{extent_.x.low, extent_.z.high, grid_.scale_x, grid_.scale_z, x, y};
        if (!panel.lines.empty())
            svg.path(solid_path(panel.lines, view, y + grid_.height),
                     "fill=\"#d5dde8\" fill-rule=\"evenodd\"");
        if (!row_.before.empty())
            svg.path(section_path(row_.before, view), dashed(0.5 * sheet_.size.line));
        if (panel.is_failed) svg.rect(frame, "fill=\"url(#" + text_.id + "-failed)\"");
        svg.path(section_path(panel.lines, view),
                 fmt::format("fill=\"none\" stroke=\"#102460\" stroke-width=\"{}\" "
                             "stroke-linejoin=\"round\"",
                             px(0.8 * sheet_.size.line)));
        svg.rect(frame, fmt::format("fill=\"none\" stroke=\"#888888\" stroke-width=\"{}\"",
                                    px(0.35 * sheet_.size.line)));
        TextStyle name = sheet_.body();
        name.bold = true;
        svg.text(x, y + grid_.height + 1.15 * body, shortened(panel.name, name, room), name);
        if (!panel.note.empty())
            svg.text(x, y + grid_.height + 2.25 * body, shortened(panel.note, sheet_.small(), room),
                     sheet_.small());
        svg.raw(close_group());
    }

    void draw_scale(Svg& svg) {
        const double body = sheet_.size.body;
        const double nm = round_length(0.6 * extent_.width());
        const double y = sheet_.room.y + head() + rows_height() + 0.7 * body;
        svg.line(sheet_.room.x, y, sheet_.room.x + nm * grid_.scale_x, y,
                 fmt::format("stroke=\"#000000\" stroke-width=\"{}\"", px(1.5 * sheet_.size.line)));
        svg.text(sheet_.room.x + nm * grid_.scale_x + 0.6 * body, y + 0.35 * body,
                 fmt::format("{:g} nm", nm) +
                     (row_.before.empty() ? "" : " · dashed: before the etch"),
                 sheet_.small());
    }

    const ProfileRow& row_;
    FigureText text_;
    Extent extent_;
    Sheet sheet_;
    PanelGrid grid_;
};

} // namespace

std::string chart_svg(const ProfileRow& row, FigureForm form) {
    return RowDrawing(row, form).draw();
}

namespace {

/// An axis that ends exactly at `low` and `high`.
AxisScale exact_scale(const std::string& title, double low, double high, double start, double end,
                      double label_px) {
    ChartAxis axis;
    axis.title = title;
    axis.unit = "nm";
    const auto most =
        static_cast<std::size_t>(std::clamp(std::fabs(end - start) / label_px, 2.0, 9.0));
    const DataRange range{true, low, high};
    AxisScale scale = make_scale(axis, range, most, false);
    AxisScale exact = scale;
    exact.low = low;
    exact.high = high;
    exact.start = start;
    exact.end = end;
    exact.ticks.clear();
    exact.labels.clear();
    for (std::size_t i = 0; i < scale.ticks.size(); ++i)
        if (scale.ticks[i] >= low - 1e-9 && scale.ticks[i] <= high + 1e-9) {
            exact.ticks.push_back(scale.ticks[i]);
            exact.labels.push_back(scale.labels[i]);
        }
    return exact;
}

std::vector<LegendEntry> overlay_legend(const ProfileOverlay& overlay) {
    std::vector<LegendEntry> legend;
    for (std::size_t i = 0; i < overlay.outlines.size(); ++i) {
        const ProfileOutline& o = overlay.outlines[i];
        legend.push_back({o.note.empty() ? o.name : o.name + " · " + o.note,
                          line_look(o.look.value_or(i)), true, false, false});
    }
    return legend;
}

void draw_outlines(Svg& svg, const ProfileOverlay& overlay, const Sheet& sheet,
                   const PlotFrame& frame, const SectionView& view) {
    for (const double z : overlay.heights)
        if (z > frame.y.low && z < frame.y.high)
            svg.line(
                frame.plot.x, frame.y.px(z), frame.plot.x + frame.plot.width, frame.y.px(z),
                fmt::format("stroke=\"#7a1f5c\" stroke-width=\"{}\" stroke-dasharray=\"{} {}\"",
                            px(0.4 * sheet.size.line), px(sheet.size.line),
                            px(1.6 * sheet.size.line)));
    if (!overlay.before.empty())
        svg.path(section_path(overlay.before, view), dashed(0.6 * sheet.size.line));
    for (std::size_t i = 0; i < overlay.outlines.size(); ++i) {
        const ProfileOutline& o = overlay.outlines[i];
        if (o.lines.empty()) continue;
        svg.raw(open_group(o.key, o.words));
        svg.path(section_path(o.lines, view),
                 "fill=\"none\" " + line_stroke(line_look(o.look.value_or(i)), sheet.size.line));
        svg.raw(close_group());
    }
}

} // namespace

std::string chart_svg(const ProfileOverlay& overlay, FigureForm form) {
    FigureText text = overlay.text;
    const Extent extent = extent_of(overlay.outlines, overlay.before);
    const std::vector<LegendEntry> legend = overlay_legend(overlay);
    Sheet sheet = lay_sheet(text, form, 0);
    const double body = sheet.size.body, labels = 4.6 * body;
    double column = 0;
    for (const LegendEntry& entry : legend)
        column = std::max(column, text_width(entry.name, sheet.body()) + 3.4 * body);
    const bool beside = form != FigureForm::narrow;
    column = beside ? std::min(column, 0.36 * sheet.room.width) : 0;
    const double above = beside ? 0 : draw_legend(nullptr, sheet, legend, 0, 0, sheet.room.width);
    const double wide = sheet.room.width - labels - column - (beside ? 2 * body : body);
    const double tall = form == FigureForm::slide
                            ? sheet.room.height - frame_margins(sheet) - 1.5 * body
                            : (beside ? 430 : 320);
    const double scale_z = std::min(wide / extent.width(), tall / extent.height());
    const double stretch = stretch_for(extent.width() * scale_z, 14 * body);
    if (stretch > 1) text.notes.push_back(stretch_note(stretch));
    const double legend_height = beside ? draw_legend(nullptr, sheet, legend, 0, 0, column) : 0;
    const double height = extent.height() * scale_z;
    sheet = lay_sheet(text, form, std::max(height + frame_margins(sheet) + above, legend_height));
    PlotFrame frame;
    frame.plot = {sheet.room.x + labels, sheet.room.y + above + 2.1 * body,
                  extent.width() * scale_z * stretch, height};
    frame.x = exact_scale("distance from the middle", extent.x.low, extent.x.high, frame.plot.x,
                          frame.plot.x + frame.plot.width, 4.5 * body);
    frame.y = exact_scale("height above the mask bottom", extent.z.low, extent.z.high,
                          frame.plot.y + frame.plot.height, frame.plot.y, 2.6 * body);
    Svg svg = start_sheet(sheet, text);
    draw_frame(svg, sheet, frame);
    const SectionView view{extent.x.low, extent.z.high, scale_z * stretch,
                           scale_z,      frame.plot.x,  frame.plot.y};
    draw_outlines(svg, overlay, sheet, frame, view);
    draw_legend(&svg, sheet, legend,
                beside ? frame.plot.x + frame.plot.width + 1.5 * body : sheet.room.x,
                beside ? frame.plot.y : sheet.room.y + 2, beside ? column : sheet.room.width);
    return svg.finish();
}

} // namespace rille::engine
