// SPDX-License-Identifier: Apache-2.0
#include "engine/palette.hpp"
#include "engine/report/chart_parts.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

struct KindLook {
    CellKind kind;
    const char* colour; ///< empty: shaded by the value
    const char* hatch;  ///< stroke pattern's path; empty = none
    const char* name;   ///< in the key
    const char* word;   ///< in the cell, where it has no text of its own
    const char* sign;   ///< where the word does not fit
};
constexpr KindLook kind_looks[] = {
    {CellKind::value, "", "", "", "", ""},
    {CellKind::open, "", "M0 10L10 0M-1 1L1 -1M9 11L11 9", "in brackets: not cleared", "", ""},
    {CellKind::failed, "#ffffff", "M0 10L10 0M0 0L10 10", "failed, no value", "failed", "×"},
    {CellKind::missing, "#ffffff", "M0 5L10 5", "not run", "", ""},
    {CellKind::met, "#8cc3b4", "", "met", "met", "✓"},
    {CellKind::missed, "#a04a22", "", "missed", "missed", "✗"},
    {CellKind::undecided, "#ffffff", "M0 0L10 10M-1 9L1 11M9 -1L11 1", "undecided", "undecided",
     "?"}};

const KindLook& look_of(CellKind kind) {
    return kind_looks[static_cast<int>(kind)];
}

class HeatDrawing {
public:
    HeatDrawing(const HeatMap& map, FigureForm form) : map_(map) {
        for (const HeatCell& cell : map.cells)
            if (cell.value && shaded(cell)) values_.add(*cell.value);
        lay(form);
    }

    std::string draw() {
        Svg svg = start_sheet(sheet_, map_.text);
        define_hatches(svg);
        double y = sheet_.room.y + 4;
        if (values_.any) y = draw_scale(svg, y);
        draw_key(&svg, y);
        for (std::size_t i = 0; i < map_.cells.size(); ++i)
            draw_cell(svg, map_.cells[i], i % map_.x_values.size(), i / map_.x_values.size());
        svg.rect(plot_, fmt::format("fill=\"none\" stroke=\"#333333\" stroke-width=\"{}\"",
                                    px(0.55 * sheet_.size.line)));
        draw_titles(svg);
        return svg.finish();
    }

private:
    static bool shaded(const HeatCell& cell) {
        return cell.kind == CellKind::value || cell.kind == CellKind::open;
    }
    std::string hatch_id(CellKind kind) const {
        return map_.text.id + "-hatch-" + std::to_string(static_cast<int>(kind));
    }

    void lay(FigureForm form) {
        sheet_ = lay_sheet(map_.text, form, 0);
        const double body = sheet_.size.body;
        const double nx = std::max<double>(1, static_cast<double>(map_.x_values.size()));
        const double ny = std::max<double>(1, static_cast<double>(map_.y_values.size()));
        double labels = text_width(map_.y_title, sheet_.body()) > 0 ? 2 * body : 0;
        for (const std::string& label : map_.y_values)
            labels = std::max(labels, text_width(label, sheet_.body()) + 0.9 * body);
        labels = std::min(labels, 0.35 * sheet_.room.width);
        const double above =
            (values_.any ? scale_height() : 0) + draw_key(nullptr, 0) + 4 + 2.1 * body;
        const double below = 3.4 * body;
        const double row = ny > 14 ? 20 : 34;
        sheet_ = lay_sheet(map_.text, form, above + ny * row + below);
        plot_.x = sheet_.room.x + labels;
        plot_.y = sheet_.room.y + above;
        plot_.width = std::min(sheet_.room.width - labels, nx * 14 * body);
        plot_.height = std::min(sheet_.room.height - above - below, ny * 5 * body);
        cell_ = {0, 0, plot_.width / nx, plot_.height / ny};
    }

    double scale_height() const { return 3.9 * sheet_.size.body; }

    double share(double value) const {
        return values_.high > values_.low ? (value - values_.low) / (values_.high - values_.low)
                                          : 0.5;
    }

    void define_hatches(Svg& svg) {
        for (const KindLook& look : kind_looks)
            if (*look.hatch)
                svg.define(fmt::format(
                    "<pattern id=\"{}\" width=\"10\" height=\"10\" patternUnits=\"userSpaceOnUse\" "
                    "patternTransform=\"scale({})\"><path d=\"{}\" stroke=\"#ffffff\" "
                    "stroke-width=\"2\" stroke-opacity=\"0.35\" fill=\"none\"/><path d=\"{}\" "
                    "stroke=\"#444444\" stroke-width=\"0.8\" stroke-opacity=\"0.6\" "
                    "fill=\"none\"/></pattern>",
                    hatch_id(look.kind), px(sheet_.size.body / 12), look.hatch, look.hatch));
    }

    /// The bar with round values beneath; returns its lower edge.
    double draw_scale(Svg& svg, double y) {
        const double body = sheet_.size.body, x = sheet_.room.x;
        const double width = std::min(sheet_.room.width - 2 * body, 30 * body);
        svg.text(x, y + body, shortened(map_.value_title, sheet_.body(), sheet_.room.width),
                 sheet_.body());
        const double top = y + 1.45 * body, height = 0.8 * body;
        const int steps = 40;
        for (int i = 0; i < steps; ++i)
            svg.rect({x + width * i / steps, top, width / steps + 0.5, height},
                     "fill=\"" + heat_colour((i + 0.5) / steps) + "\"");
        svg.rect({x, top, width, height}, "fill=\"none\" stroke=\"#333333\" stroke-width=\"0.6\"");
        ChartAxis axis;
        const bool flat = !(values_.high > values_.low);
        AxisScale scale = make_scale(axis, values_, 5, false);
        scale.low = values_.low;
        scale.high = values_.high;
        scale.start = x;
        scale.end = x + width;
        double last = x - 10 * body;
        for (std::size_t i = 0; i < scale.ticks.size() && !flat; ++i) {
            const double at = scale.px(scale.ticks[i]);
            if (at < x - 0.5 || at > x + width + 0.5) continue;
            const double half = 0.5 * text_width(scale.labels[i], sheet_.body());
            if (at - half < last + 0.5 * body) continue;
            svg.line(at, top + height, at, top + height + 0.3 * body,
                     "stroke=\"#333333\" stroke-width=\"0.8\"");
            const double centre = std::max(at, half + 2);
            svg.text(centre, top + height + 1.3 * body, scale.labels[i],
                     sheet_.body(Anchor::middle));
            last = centre + half;
        }
        if (flat) svg.text(x, top + height + 1.3 * body, "all values alike", sheet_.body());
        return y + scale_height();
    }

    /// What the hatches and verdicts mean; returns its height.
    double draw_key(Svg* svg, double y) const {
        const double body = sheet_.size.body, row = 1.6 * body;
        double at = sheet_.room.x, top = y;
        bool any = false;
        for (const KindLook& look : kind_looks) {
            const bool used =
                std::any_of(map_.cells.begin(), map_.cells.end(),
                            [&](const HeatCell& cell) { return cell.kind == look.kind; });
            if (!used || !*look.name) continue;
            const double wide = 2.2 * body + text_width(look.name, sheet_.body());
            if (any && at + wide > sheet_.room.x + sheet_.room.width) {
                at = sheet_.room.x;
                top += row;
            }
            any = true;
            if (svg) {
                paint(*svg, {at, top + 0.35 * body, 1.6 * body, 0.95 * body}, look,
                      *look.colour ? look.colour : heat_colour(0.25));
                svg->text(at + 2.2 * body, top + 1.15 * body, look.name, sheet_.body());
            }
            at += wide + 1.4 * body;
        }
        return any ? top - y + row : 0;
    }

    void paint(Svg& svg, const Box& box, const KindLook& look, const std::string& colour) const {
        svg.rect(box, "fill=\"" + colour + "\" stroke=\"#777777\" stroke-width=\"0.6\"");
        if (*look.hatch) svg.rect(box, "fill=\"url(#" + hatch_id(look.kind) + ")\"");
    }

    void draw_cell(Svg& svg, const HeatCell& cell, std::size_t column, std::size_t row) {
        const KindLook& look = look_of(cell.kind);
        const Box box{plot_.x + static_cast<double>(column) * cell_.width,
                      plot_.y + plot_.height - static_cast<double>(row + 1) * cell_.height,
                      cell_.width, cell_.height};
        const std::string colour = *look.colour ? look.colour
                                   : cell.value ? heat_colour(share(*cell.value))
                                                : "#ffffff";
        svg.raw(open_group(cell.key, cell.words));
        paint(svg, box, look, colour);
        print(svg, cell, look, colour, box);
        svg.raw(close_group());
    }

    /// The longest text that fits: with its error, the value alone, or a sign.
    void print(Svg& svg, const HeatCell& cell, const KindLook& look, const std::string& colour,
               const Box& box) {
        std::string full = cell.text.empty() ? look.word : cell.text;
        std::string bare = full.substr(0, full.find(" ±"));
        if (cell.kind == CellKind::open) {
            full = "(" + full + ")";
            bare = "(" + bare + ")";
        }
        TextStyle style = sheet_.body(Anchor::middle);
        style.colour = lightness(colour) > 55 ? "#111111" : "#ffffff";
        style.halo = *look.hatch && lightness(colour) > 55;
        for (const std::string& text : {full, bare, std::string(look.sign)})
            for (const double size : {1.0, 0.85, 0.72}) {
                style.size = size * sheet_.size.body;
                if (text.empty() || text_width(text, style) > box.width - 4 ||
                    style.size * 1.2 > box.height)
                    continue;
                svg.text(box.x + 0.5 * box.width, box.y + 0.5 * box.height + 0.35 * style.size,
                         text, style);
                return;
            }
    }

    void draw_titles(Svg& svg) {
        const double body = sheet_.size.body;
        const TextStyle middle = sheet_.body(Anchor::middle), end = sheet_.body(Anchor::end);
        double last = -1e9;
        for (std::size_t i = 0; i < map_.x_values.size(); ++i) {
            const double at = plot_.x + (static_cast<double>(i) + 0.5) * cell_.width;
            const std::string label =
                shortened(map_.x_values[i], middle, std::max(cell_.width, 4 * body));
            const double half = 0.5 * text_width(label, middle);
            if (at - half < last + 0.4 * body || at + half > sheet_.width - 2) continue;
            svg.text(at, plot_.y + plot_.height + 1.3 * body, label, middle);
            last = at + half;
        }
        double above = 1e9;
        for (std::size_t i = 0; i < map_.y_values.size(); ++i) {
            const double at =
                plot_.y + plot_.height - (static_cast<double>(i) + 0.5) * cell_.height;
            if (above - at < 1.1 * body) continue;
            svg.text(plot_.x - 0.5 * body, at + 0.35 * body,
                     shortened(map_.y_values[i], end, plot_.x - sheet_.room.x - 0.5 * body), end);
            above = at;
        }
        svg.text(sheet_.room.x, plot_.y - 0.85 * body,
                 shortened(map_.y_title, sheet_.body(), sheet_.room.width), sheet_.body());
        const std::string across =
            shortened(map_.x_title, middle, sheet_.width - sheet_.size.margin);
        const double half = 0.5 * text_width(across, middle);
        svg.text(std::clamp(plot_.x + 0.5 * plot_.width, half + 2, sheet_.width - half - 2),
                 plot_.y + plot_.height + 2.85 * body, across, middle);
    }

    const HeatMap& map_;
    DataRange values_;
    Sheet sheet_;
    Box plot_, cell_;
};

} // namespace

std::string chart_svg(const HeatMap& map, FigureForm form) {
    return HeatDrawing(map, form).draw();
}

} // namespace rille::engine
