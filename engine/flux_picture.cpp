// SPDX-License-Identifier: Apache-2.0
#include "engine/surface_flux.hpp"

#include "engine/cause_bands.hpp"
#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/run_record.hpp"
#include "engine/sources.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

constexpr double margin = 28, axis_room = 66, head = 84, foot = 44;
constexpr double chart_width = 560, chart_height = 190, chart_gap = 62, legend_room = 200;
constexpr double section_width = 380, section_height = 660;
constexpr double per_minute = 60;

struct Line {
    std::string name, colour, dashes;
    std::vector<double> value; ///< along the walk
};

constexpr const char* colours[] = {"#102460", "#c8662a", "#1f7a6d",
                                   "#8c4c8c", "#7a9cc6", "#b58a00"};
constexpr const char* dashes[] = {"", "8 3", "3 2", "10 3 2 3", "1 2", "5 2"};

TextStyle small(Anchor anchor, double rotate = 0) {
    return {10.5, anchor, false, "#222222", false, rotate};
}

/// One chart over the arc length.
class Chart {
public:
    Chart(Svg& svg, double left, double top, const SectionWalk& walk, const AxisScale& up)
        : svg_(svg), left_(left), top_(top), walk_(walk), across_{0, walk.length, false}, up_(up) {}

    void frame(const std::string& title, const std::string& unit, bool with_across) {
        svg_.text(left_, top_ - 8, title, {12, Anchor::start, true, "#222222", false, 0});
        for (const double v : across_.ticks(6)) {
            const double x = left_ + chart_width * across_.part(v);
            svg_.line(x, top_, x, top_ + chart_height, "stroke=\"#e2e2e2\" stroke-width=\"0.8\"");
            svg_.text(x, top_ + chart_height + 15, rounded(v, 20), small(Anchor::middle));
        }
        for (const double v : up_.ticks(4)) {
            const double y = at(v);
            svg_.line(left_, y, left_ + chart_width, y,
                      v == 0 && !up_.logarithmic ? "stroke=\"#333333\" stroke-width=\"1\""
                                                 : "stroke=\"#e2e2e2\" stroke-width=\"0.8\"");
            svg_.text(left_ - 6, y + 4, fmt::format("{:.4g}", v), small(Anchor::end));
        }
        svg_.rect({left_, top_, chart_width, chart_height},
                  "fill=\"none\" stroke=\"#333333\" stroke-width=\"1\"");
        svg_.text(left_ - 48, top_ + 0.5 * chart_height, unit, small(Anchor::middle, -90));
        if (with_across)
            svg_.text(left_ + 0.5 * chart_width, top_ + chart_height + 34,
                      "arc length along the section (nm)", small(Anchor::middle));
    }
    std::array<double, 2> place(std::size_t i, double value) const {
        return {left_ + chart_width * across_.part(walk_.arc[i]), at(value)};
    }
    void lines(const std::vector<Line>& lines) {
        double row = top_ + 12;
        for (const Line& line : lines) {
            std::vector<std::array<double, 2>> points;
            for (std::size_t i = 0; i < line.value.size(); ++i)
                points.push_back(place(i, line.value[i]));
            const std::string style =
                fmt::format("fill=\"none\" stroke=\"{}\" stroke-width=\"1.6\" "
                            "stroke-linejoin=\"round\" stroke-dasharray=\"{}\"",
                            line.colour, line.dashes);
            svg_.path(path_data(points, false), style);
            const double x = left_ + chart_width + 14;
            svg_.path(path_data({{x, row - 4}, {x + 26, row - 4}}, false), style);
            svg_.text(x + 32, row, line.name, {11, Anchor::start, false, "#222222", false, 0});
            row += 18;
        }
    }

private:
    double at(double value) const { return top_ + chart_height * (1 - up_.part(value)); }

    Svg& svg_;
    double left_, top_;
    const SectionWalk& walk_;
    AxisScale across_, up_;
};

std::vector<double> along(const SectionWalk& walk, const std::vector<double>& field, double scale) {
    std::vector<double> values;
    for (const int e : walk.element)
        values.push_back(scale * field[e]);
    return values;
}

const FluxColumn* column_of(const SurfaceFlux& flux, const std::string& name) {
    for (const FluxColumn& column : flux.columns)
        if (column.name == name) return &column;
    return nullptr;
}

/// Shares of the open flux: every ion straight from the plasma, and after reflections.
std::vector<Line> ion_lines(const Case& c, const SurfaceFlux& flux, const SectionWalk& walk) {
    const fluxes::Sources open = sources_of(c, c.plasmas.at(flux.plasma));
    double all = 0;
    for (const fluxes::IonSource& ion : open.ions)
        all += ion.flux;
    for (const fluxes::FastNeutrals& fast : open.fast_neutrals)
        all += fast.source.flux;
    struct Kind {
        const char *name, *before, *after;
    };
    std::vector<Line> lines;
    for (const Kind& kind :
         {Kind{"direct ions", "ion_", "_direct"}, Kind{"reflected ions", "ion_", "_reflected"},
          Kind{"fast neutrals", "fast_neutral_of_", ""}}) {
        std::vector<double> sum(walk.element.size(), 0.0);
        bool any = false;
        for (const std::string& ion : c.mechanism.ions)
            if (const auto* column = column_of(flux, kind.before + ion + kind.after)) {
                const auto part = along(walk, column->value, all > 0 ? 1 / all : 0);
                for (std::size_t i = 0; i < sum.size(); ++i)
                    any = (sum[i] += part[i]) > 0 || any;
            }
        if (any) lines.push_back({kind.name, colours[lines.size()], dashes[lines.size()], sum});
    }
    return lines;
}

std::vector<Line> neutral_lines(const Case& c, const SurfaceFlux& flux, const SectionWalk& walk) {
    const fluxes::Sources open = sources_of(c, c.plasmas.at(flux.plasma));
    std::vector<Line> lines;
    for (std::size_t k = 0; k < open.neutrals.size(); ++k) {
        const auto* column = column_of(flux, "neutral_" + open.neutrals[k].name);
        if (!column || !(open.neutrals[k].flux > 0)) continue;
        lines.push_back({open.neutrals[k].name, colours[lines.size() % 6], dashes[lines.size() % 6],
                         along(walk, column->value, 1 / open.neutrals[k].flux)});
    }
    return lines;
}

/// Decades from 1 down to what matters, at most five.
AxisScale share_scale(const std::vector<Line>& lines) {
    double least = 0.1;
    for (const Line& line : lines)
        for (const double value : line.value)
            if (value > 0) least = std::min(least, value);
    const double decades = std::clamp(std::ceil(-std::log10(least) - 1e-9), 1.0, 5.0);
    return {std::pow(10.0, -decades), 2, true};
}

View section_view(const Case& c, const Section& section) {
    View v = view_of(c, section, 0.14, 0.06, section_width, section_height);
    const double stretch = std::floor(section_width / v.width());
    if (v.width() < 0.4 * section_width) v.scale_x *= stretch;
    v.left = margin + axis_room;
    v.top = head;
    return v;
}

/// Dots along the front at the round arc lengths of the charts.
void draw_arc_marks(Svg& svg, const View& v, const SectionWalk& walk) {
    for (const double at : AxisScale{0, walk.length, false}.ticks(6)) {
        const std::size_t i = std::min<std::size_t>(
            std::lower_bound(walk.arc.begin(), walk.arc.end(), at) - walk.arc.begin(),
            walk.arc.size() - 1);
        const auto p = v.at(walk.middle[i]);
        svg.raw(fmt::format("<circle cx=\"{}\" cy=\"{}\" r=\"3\" fill=\"#ffffff\" "
                            "stroke=\"#000000\" stroke-width=\"1.2\"/>",
                            px(p[0]), px(p[1])));
        const bool near_right = p[0] > v.right() - 40;
        svg.text(p[0] + (near_right ? -6 : 6), p[1] - 5, rounded(at, 20),
                 {10, near_right ? Anchor::end : Anchor::start, true, "#000000", true, 0});
    }
}

} // namespace

std::string flux_picture_svg(const Case& c, const SurfaceFlux& flux) {
    const Section section = vertical_section(c.domain, flux.state.surface, section_y(c));
    const SectionWalk walk = longest_walk(section);
    const Metrics no_metrics;
    const std::vector<PictureFront> no_fronts;
    const PictureContext p{c,       no_fronts,  flux.state,
                           section, no_metrics, material_looks(c.materials)};
    const View v = section_view(c, section);
    const double left = v.right() + 90;
    const double below = std::max(v.bottom() + 40, head + 3 * chart_height + 2 * chart_gap + 50);
    Svg svg(left + chart_width + legend_room + margin, below + foot, c.title);
    for (std::size_t m = 0; m < p.looks.size(); ++m)
        svg.define(hatch_pattern("hatch" + std::to_string(m), p.looks[m]));
    svg.define(cause_hatch());
    draw_section(svg, v, p);
    draw_depth_axis(svg, v);
    draw_scale_bars(svg, v);
    draw_arc_marks(svg, v, walk);

    const auto ions = ion_lines(c, flux, walk), neutrals = neutral_lines(c, flux, walk);
    Chart ion_chart(svg, left, head + 10, walk, share_scale(ions));
    ion_chart.frame("Ions", "share of the open ion flux", false);
    ion_chart.lines(ions);
    double y = head + 10 + chart_height + chart_gap;
    Chart neutral_chart(svg, left, y, walk, share_scale(neutrals));
    neutral_chart.frame("Neutrals", "share of the open flux", false);
    neutral_chart.lines(neutrals);
    y += chart_height + chart_gap;
    fluxes::CauseFields bands;
    for (const auto& cause : flux.cause)
        bands.push_back(along(walk, cause, per_minute));
    auto range = band_range(bands);
    if (range[1] - range[0] <= 0) range[1] = 1;
    const AxisScale rate{range[0] * 1.05, range[1] * 1.08 - 0.02 * range[0], false};
    Chart rate_chart(svg, left, y, walk, rate);
    draw_cause_bands(svg, bands,
                     [&](std::size_t i, double value) { return rate_chart.place(i, value); });
    rate_chart.frame("Rate by its causes", "rate (nm/min)", true);
    draw_cause_legend(svg, bands, 1e-3 * (range[1] - range[0]), left + chart_width + 14, y);

    svg.text(margin, 40, c.title, {20, Anchor::start, true, "#111111", false, 0});
    svg.text(margin, 62,
             fmt::format("Arrivals and rates on the surface as it stands · plasma {} · spacing {} "
                         "nm",
                         flux.plasma, rounded(c.domain.spacing)),
             {12.5, Anchor::start, false, "#444444", false, 0});
    svg.line(margin, svg.height() - 30, svg.width() - margin, svg.height() - 30,
             "stroke=\"#999999\" stroke-width=\"0.6\"");
    svg.text(margin, svg.height() - 13,
             "model prediction, not a released recipe · " + standing_line(c) +
                 " · sampling errors in flux.csv, grid error not assessed",
             {10.5, Anchor::start, false, "#444444", false, 0});
    return svg.finish();
}

} // namespace rille::engine
