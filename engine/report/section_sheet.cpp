// SPDX-License-Identifier: Apache-2.0
#include "engine/report/section_sheet.hpp"

#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/run_record.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <memory>

namespace rille::engine {
namespace {

using Points = std::vector<std::array<double, 2>>;

constexpr double margin = 14, axis_room = 60, head = 58, foot = 88;
constexpr double tallest = 450, widest = 290, narrowest = 120;
constexpr double drawn_to = 0.08; ///< [px] a line may leave its points by

double column_room(const Case& c) {
    double room = 0;
    for (const geometry::Film& film : c.films)
        room = std::max(room, text_width(film.name + ", " + c.materials.at(film.material) +
                                             (std::isfinite(film.bottom) ? " 100 nm" : ""),
                                         {11, Anchor::start, false, "", false, 0}));
    return std::min(room, 240.0) + 32;
}

/// The frame around every one of the sections.
View frame_of(const Case& c, const std::vector<const Section*>& sections) {
    View v;
    v.x_min = -c.domain.x_max();
    v.x_max = c.domain.x_max();
    double low = 0, high = 0;
    for (const Section* section : sections)
        for (const SectionLine& line : *section)
            for (const auto& point : line.points) {
                low = std::min(low, point[1]);
                high = std::max(high, point[1]);
            }
    const double width = v.x_max - v.x_min, extent = std::max(high - low, 0.1 * width);
    v.z_low = low - 0.1 * extent;
    v.z_high = high + 0.06 * extent;
    v.scale_z = std::min(tallest / (v.z_high - v.z_low), widest / width);
    v.scale_x = v.scale_z;
    if (v.width() < narrowest) v.scale_x *= std::ceil(narrowest / v.width() - 1e-9);
    v.left = margin + axis_room;
    v.top = head;
    return v;
}

/// Sets a text into a width, smaller where it must be.
void fitted(Svg& svg, double y, const std::string& text, double size, bool bold,
            const char* colour) {
    const double room = svg.width() - 2 * margin;
    const double wide = text_width(text, {size, Anchor::start, bold, "", false, 0});
    svg.text(margin, y, text,
             {wide > room ? size * room / wide : size, Anchor::start, bold, colour, false, 0});
}

Svg sheet_of(const Case& c, const View& v, const std::string& subtitle) {
    Svg svg(std::ceil(v.right() + column_room(c) + margin), std::ceil(v.bottom() + foot), c.title);
    fitted(svg, 24, c.title, 14, true, "#111111");
    fitted(svg, 42, subtitle, 11, false, "#444444");
    const double y = svg.height();
    svg.line(margin, y - 36, svg.width() - margin, y - 36,
             "stroke=\"#999999\" stroke-width=\"0.6\"");
    fitted(svg, y - 22, "model prediction, not a released recipe · errors shown are numerical only",
           9.5, false, "#444444");
    fitted(svg, y - 8, standing_line(c), 9.5, false, "#444444");
    const std::vector<MaterialLook> looks = material_looks(c.materials);
    for (std::size_t m = 0; m < looks.size(); ++m)
        svg.define(hatch_pattern("hatch" + std::to_string(m), looks[m]));
    return svg;
}

std::string subtitle_of(const Case& c, const std::string& when) {
    std::string text = when;
    if (!c.chemistry.empty()) text += " · " + c.chemistry;
    if (c.domain.revolved()) text += " · section through the axis";
    if (!c.domain.planar_contour())
        text += " · section at y = " + rounded(section_y(c), 20) + " nm";
    return text + fmt::format(" · spacing {:.4g} nm", c.domain.spacing);
}

Section section_of(const Case& c, const SurfaceState& state) {
    return vertical_section(c.domain, state.surface, section_y(c));
}

/// A section with no more points than its drawing shows.
Section lighter(const Section& section, double tolerance) {
    Section light;
    for (const SectionLine& line : section) {
        light.push_back({thinned(line.points, tolerance), {}, line.closed});
        if (light.back().points.size() < 3 && line.closed) light.pop_back();
    }
    return light;
}

double distance(const std::array<double, 2>& p, const std::array<double, 2>& a,
                const std::array<double, 2>& b) {
    const double dx = b[0] - a[0], dy = b[1] - a[1], length = std::hypot(dx, dy);
    if (!(length > 0)) return std::hypot(p[0] - a[0], p[1] - a[1]);
    return std::fabs(dx * (p[1] - a[1]) - dy * (p[0] - a[0])) / length;
}

} // namespace

Points thinned(const Points& points, double tolerance) {
    if (points.size() < 3) return points;
    std::vector<char> kept(points.size(), 0);
    kept.front() = kept.back() = 1;
    std::vector<std::pair<std::size_t, std::size_t>> spans = {{0, points.size() - 1}};
    while (!spans.empty()) {
        const auto [first, last] = spans.back();
        spans.pop_back();
        double farthest = tolerance;
        std::size_t at = first;
        for (std::size_t i = first + 1; i < last; ++i) {
            const double d = distance(points[i], points[first], points[last]);
            if (d > farthest) {
                farthest = d;
                at = i;
            }
        }
        if (at == first) continue;
        kept[at] = 1;
        spans.emplace_back(first, at);
        spans.emplace_back(at, last);
    }
    Points left;
    for (std::size_t i = 0; i < points.size(); ++i)
        if (kept[i]) left.push_back(points[i]);
    return left;
}

std::string section_sheet(const Case& c, const std::vector<PictureFront>& fronts,
                          const SurfaceState& last, const Metrics& metrics) {
    const Section profile = section_of(c, last);
    std::vector<const Section*> all = {&profile};
    for (const PictureFront& front : fronts)
        all.push_back(&front.section);
    const View v = frame_of(c, all);
    Svg svg = sheet_of(
        c, v, subtitle_of(c, "after " + time_text(last.time_s) + unfinished_words(metrics)));
    const PictureContext p{c, fronts, last, profile, metrics, material_looks(c.materials)};
    draw_section(svg, v, p);
    draw_depth_axis(svg, v);
    draw_scale_bars(svg, v);
    draw_film_column(svg, v, p);
    return svg.finish();
}

struct Timeline::Drawing {
    const Case& c;
    Metrics no_metrics;
    std::vector<PictureFront> no_fronts;
    Section before;
    View view;
    Svg svg;
    std::vector<MaterialLook> looks;
    std::vector<std::pair<double, std::string>> moments; ///< time and markup

    Drawing(const Case& the_case, const Section& first, const Section& last)
        : c(the_case), before(first), view(frame_of(c, {&first, &last})),
          svg(sheet_of(c, view, subtitle_of(c, "profile over time"))),
          looks(material_looks(c.materials)) {}
    PictureContext context(const SurfaceState& state, const Section& section) const {
        return {c, no_fronts, state, section, no_metrics, looks};
    }
};

Timeline::Timeline(const Case& c, const SurfaceState& first, const SurfaceState& last)
    : drawing_(std::make_unique<Drawing>(c, section_of(c, first), section_of(c, last))) {
    const View& v = drawing_->view;
    const PictureContext p = drawing_->context(first, drawing_->before);
    drawing_->svg.define(fmt::format("<clipPath id=\"frame\"><rect x=\"{}\" y=\"{}\" width=\"{}\" "
                                     "height=\"{}\"/></clipPath>",
                                     px(v.left), px(v.top), px(v.width()), px(v.height())));
    Svg films(1, 1, "");
    draw_films(films, v, p);
    drawing_->svg.define("<g id=\"films\">" + films.body() + "</g>");
    draw_depth_axis(drawing_->svg, v);
    draw_scale_bars(drawing_->svg, v);
    draw_film_column(drawing_->svg, v, p);
}

Timeline::~Timeline() = default;

void Timeline::add(const SurfaceState& state) {
    const View& v = drawing_->view;
    const Section whole = section_of(drawing_->c, state);
    const Section light = lighter(whole, drawn_to / std::max(v.scale_x, v.scale_z));
    const std::string solid = fmt::format("solid{}", drawing_->moments.size());
    Svg grown(1, 1, ""), moment(1, 1, "");
    draw_grown_films(grown, v, drawing_->context(state, whole));
    moment.raw("<clipPath id=\"" + solid +
               "\" clip-path=\"url(#frame)\"><path clip-rule=\"evenodd\" d=\"" +
               solid_path(v, light) + "\"/></clipPath>");
    moment.raw("<g clip-path=\"url(#" + solid + ")\"><use href=\"#films\"/>" + grown.body() +
               "</g><g clip-path=\"url(#frame)\">");
    draw_front(moment, v, lighter(drawing_->before, drawn_to / v.scale_z),
               "stroke=\"#5a6478\" stroke-width=\"1\" stroke-dasharray=\"5 3\"");
    draw_front(moment, v, light, "stroke=\"#000000\" stroke-width=\"2.2\"");
    moment.raw("</g>");
    moment.text(v.left + 0.5 * v.width(), v.top + 15, time_text(state.time_s),
                {12, Anchor::middle, true, "#1b3266", true, 0});
    drawing_->moments.emplace_back(state.time_s, moment.body());
}

std::string Timeline::finish() {
    Svg& svg = drawing_->svg;
    const View& v = drawing_->view;
    for (std::size_t i = 0; i < drawing_->moments.size(); ++i)
        svg.raw(fmt::format("<g class=\"moment\"{}>\n{}</g>",
                            i + 1 < drawing_->moments.size() ? " display=\"none\"" : "",
                            drawing_->moments[i].second));
    svg.rect({v.left, v.top, v.width(), v.height()},
             "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
    return svg.finish();
}

} // namespace rille::engine
