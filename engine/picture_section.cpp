// SPDX-License-Identifier: Apache-2.0
#include "engine/picture_parts.hpp"

#include "engine/number_text.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <optional>

namespace rille::engine {
namespace {

using Points = std::vector<std::array<double, 2>>;

constexpr double thinnest_film_px = 1.6; // a grown film is never drawn thinner
constexpr const char* mark_colour = "#7a1f5c";

std::string fill(const std::string& colour) {
    return "fill=\"" + colour + "\"";
}

/// Direction into the solid at each point of a section line, unit, in the section's plane.
Points inward(const SectionLine& line, const geometry::Surface& s) {
    Points direction(line.points.size(), {0, 0});
    for (std::size_t i = 0; i < line.element.size(); ++i) {
        const geometry::Vec3 n = normal_of(s, line, i);
        for (const std::size_t point : {i, i + 1}) {
            direction[point][0] -= n.x;
            direction[point][1] -= n.z;
        }
    }
    for (auto& d : direction) {
        const double length = std::hypot(d[0], d[1]);
        if (length > 0) d = {d[0] / length, d[1] / length};
    }
    return direction;
}

std::vector<double> at_points(const SectionLine& line, const std::vector<double>& on_elements) {
    std::vector<double> value(line.points.size(), 0), count(line.points.size(), 0);
    for (std::size_t i = 0; i < line.element.size(); ++i)
        for (const std::size_t point : {i, i + 1}) {
            value[point] += on_elements[line.element[i]];
            count[point] += 1;
        }
    for (std::size_t i = 0; i < value.size(); ++i)
        if (count[i] > 0) value[i] /= count[i];
    return value;
}

void draw_grown_film(Svg& svg, const View& v, const PictureContext& p, const SectionLine& line,
                     std::size_t film, std::vector<double>& depth) {
    const Points into = inward(line, p.last.surface);
    std::vector<double> thickness = at_points(line, p.last.grown.thickness[film]);
    const double visible = thinnest_film_px / v.scale_z;
    Points strip, inner;
    const auto flush = [&] {
        if (strip.size() > 1) {
            strip.insert(strip.end(), inner.rbegin(), inner.rend());
            svg.path(path_data(strip, true),
                     fill(p.looks.at(p.last.grown.material[film]).colour) +
                         " stroke=\"#000000\" stroke-opacity=\"0.4\" stroke-width=\"0.3\"");
        }
        strip.clear();
        inner.clear();
    };
    for (std::size_t i = 0; i < line.points.size(); ++i) {
        if (!(thickness[i] > 1e-3)) { // thinner than any atom: not a film
            flush();
            continue;
        }
        const double outer_depth = depth[i],
                     inner_depth = depth[i] + std::max(thickness[i], visible);
        const auto at = [&](double d) {
            return v.at({line.points[i][0] + d * into[i][0], line.points[i][1] + d * into[i][1]});
        };
        strip.push_back(at(outer_depth));
        inner.push_back(at(inner_depth));
        depth[i] = inner_depth;
    }
    flush();
}

/// Keeps labels apart: the first to ask for a place has it.
class Places {
public:
    bool take(const Box& box) {
        if (std::any_of(taken_.begin(), taken_.end(),
                        [&](const Box& other) { return box.overlaps(other); }))
            return false;
        taken_.push_back(box);
        return true;
    }

private:
    std::vector<Box> taken_;
};

std::string feature_metric(const PictureContext& p, const std::string& name,
                           const std::string& feature) {
    const Metric* metric = p.metrics.find(name, feature);
    return metric && metric->value ? value_text(*metric) : "";
}

void draw_cd_mark(Svg& svg, const View& v, const PictureContext& p,
                  const geometry::Opening& opening, const std::string& name, double z,
                  Places& places) {
    double left = 0, right = 0;
    if (!walls_at(p.profile, z, opening.centre_x, left, right)) return;
    const std::string value = feature_metric(p, name + " cd", opening.name);
    if (value.empty()) return;
    const double a = v.x(left), b = v.x(right), y = v.y(z);
    const std::string stroke = fmt::format("stroke=\"{}\" stroke-width=\"1.2\"", mark_colour);
    svg.line(a, y, b, y, stroke);
    for (const auto& [tip, inwards] : {std::pair(a, 1.0), std::pair(b, -1.0)}) {
        svg.path(
            path_data({{tip + inwards * 6, y - 3}, {tip, y}, {tip + inwards * 6, y + 3}}, false),
            "fill=\"none\" " + stroke);
    }
    places.take({a, y - 4, b - a, 8});
    TextStyle style{11, Anchor::middle, true, mark_colour, true, 0};
    const std::string bare = value.substr(0, value.find(" ±"));
    for (const std::string& text : {name + " " + value + " nm", value + " nm", value, bare}) {
        if (text_width(text, style) > b - a - 20) continue;
        for (const double offset : {-6.0, 15.0})
            if (places.take(text_box(0.5 * (a + b), y + offset, text, style))) {
                svg.text(0.5 * (a + b), y + offset, text, style);
                return;
            }
    }
}

/// Height of the front on a vertical line, the topmost crossing.
std::optional<double> height_on(const Section& section, double x) {
    std::optional<double> height;
    for (const SectionLine& line : section)
        for (std::size_t i = 0; i + 1 < line.points.size(); ++i) {
            const auto &p = line.points[i], &q = line.points[i + 1];
            if ((p[0] <= x) == (q[0] <= x)) continue;
            const double z = p[1] + (q[1] - p[1]) * (x - p[0]) / (q[0] - p[0]);
            if (!height || z > *height) height = z;
        }
    return height;
}

void draw_time_labels(Svg& svg, const View& v, const PictureContext& p, double axis,
                      Places& places) {
    for (std::size_t f = p.fronts.size() - 1;
         f-- > 1;) { // the last and the first speak for themselves
        const auto z = height_on(p.fronts[f].section, axis);
        if (!z) continue;
        const std::string text = time_text(p.fronts[f].time_s);
        const TextStyle style{10, Anchor::middle, false, "#1b3266", true, 0};
        double left = 0, right = 0;
        if (!walls_at(p.profile, *z, axis, left, right) ||
            (right - left) * v.scale_x < text_width(text, style) + 8)
            continue;
        const double y = v.y(*z) - 4;
        if (places.take(text_box(v.x(axis), y, text, style))) svg.text(v.x(axis), y, text, style);
    }
}

void draw_angle_labels(Svg& svg, const View& v, const PictureContext& p,
                       const geometry::Opening& opening, Places& places) {
    const Metric* depth = p.metrics.find("depth centre", opening.name);
    if (!depth || !depth->value || *depth->value <= 0) return;
    const double z = -0.35 * *depth->value;
    double left = 0, right = 0;
    if (!walls_at(p.profile, z, opening.centre_x, left, right)) return;
    for (const bool on_left : {true, false}) {
        const Metric* angle =
            p.metrics.find(on_left ? "sidewall angle left" : "sidewall angle right", opening.name);
        if (!angle || !angle->value) continue;
        const std::string text = rounded(*angle->value, std::max(angle->sampling_error, 0.1)) + "°";
        const TextStyle style{11, on_left ? Anchor::end : Anchor::start, false, "#222222", true, 0};
        const double x = on_left ? v.x(left) - 7 : v.x(right) + 7;
        const Box box = text_box(x, v.y(z) + 4, text, style);
        if (box.x < v.left + 2 || box.x + box.width > v.right() - 2 || !places.take(box)) continue;
        svg.text(x, v.y(z) + 4, text, style);
    }
}

} // namespace

View view_of(const Case& c, const Section& section, double below, double above, double width,
             double height) {
    View v;
    v.x_min = c.domain.revolved() ? -c.domain.x_max() : c.domain.x_min();
    v.x_max = c.domain.x_max();
    double low = 0, high = 0;
    for (const SectionLine& line : section)
        for (const auto& point : line.points) {
            low = std::min(low, point[1]);
            high = std::max(high, point[1]);
        }
    const double extent = std::max(high - low, 0.2 * (v.x_max - v.x_min));
    v.z_low = low - below * extent;
    v.z_high = high + above * extent;
    v.scale_x = v.scale_z = std::min(height / (v.z_high - v.z_low), width / (v.x_max - v.x_min));
    return v;
}

std::string solid_path(const View& v, const Section& section) {
    std::string data;
    const double middle = 0.5 * (v.x_min + v.x_max), deep = v.z_low - (v.z_high - v.z_low);
    for (const SectionLine& line : section) {
        Points points = line.points;
        if (points.size() < 2) continue;
        const bool from_left = points.front()[0] < middle, to_left = points.back()[0] < middle;
        if (!line.closed && from_left != to_left) {
            // The front may end half a cell short of the side; the solid does not.
            const double first = from_left ? v.x_min : v.x_max;
            const double last = to_left ? v.x_min : v.x_max;
            points.insert(points.begin(), {first, points.front()[1]});
            points.push_back({last, points.back()[1]});
            points.push_back({last, deep});
            points.push_back({first, deep});
        }
        for (auto& p : points)
            p = v.at(p);
        data += path_data(points, true);
    }
    return data;
}

void draw_films(Svg& svg, const View& v, const PictureContext& p) {
    for (const geometry::Film& film : p.c.films) {
        const bool topmost = &film == &p.c.films.front();
        const double top = topmost ? v.z_high : std::min(film.top, v.z_high);
        const double bottom = std::max(film.bottom, v.z_low);
        if (top <= bottom) continue;
        const Box band{v.left, v.y(top), v.width(), v.y(bottom) - v.y(top)};
        const MaterialLook& look = p.looks.at(film.material);
        svg.rect(band, fill(look.colour));
        if (look.hatch) svg.rect(band, fmt::format("fill=\"url(#hatch{})\"", film.material));
        svg.line(v.left, v.y(bottom), v.right(), v.y(bottom),
                 "stroke=\"#000000\" stroke-opacity=\"0.35\" stroke-width=\"0.6\"");
    }
}

void draw_grown_films(Svg& svg, const View& v, const PictureContext& p) {
    for (const SectionLine& line : p.profile) {
        std::vector<double> depth(line.points.size(), 0);
        for (std::size_t film = p.last.grown.material.size(); film-- > 0;)
            draw_grown_film(svg, v, p, line, film, depth);
    }
}

void draw_front(Svg& svg, const View& v, const Section& section, const std::string& style) {
    std::string data;
    for (const SectionLine& line : section) {
        Points points = line.points;
        for (auto& p : points)
            p = v.at(p);
        data += path_data(points, line.closed);
    }
    svg.path(data, "fill=\"none\" stroke-linejoin=\"round\" " + style);
}

void draw_section(Svg& svg, const View& v, const PictureContext& p) {
    svg.define("<clipPath id=\"frame\"><rect x=\"" + px(v.left) + "\" y=\"" + px(v.top) +
               "\" width=\"" + px(v.width()) + "\" height=\"" + px(v.height()) + "\"/></clipPath>");
    svg.define("<clipPath id=\"solid\" clip-path=\"url(#frame)\"><path clip-rule=\"evenodd\" d=\"" +
               solid_path(v, p.profile) + "\"/></clipPath>");
    svg.raw("<g clip-path=\"url(#solid)\">");
    draw_films(svg, v, p);
    draw_grown_films(svg, v, p);
    svg.raw("</g>");
    svg.raw("<g clip-path=\"url(#frame)\">");
    for (std::size_t f = 0; f + 1 < p.fronts.size(); ++f)
        draw_front(svg, v, p.fronts[f].section,
                   fmt::format("stroke=\"{}\" stroke-width=\"1\"{}",
                               front_colour(f, p.fronts.size()),
                               f == 0 ? " stroke-dasharray=\"5 3\"" : ""));
    draw_front(svg, v, p.profile, "stroke=\"#000000\" stroke-width=\"2.2\"");
    if (const auto& measured = p.c.measured.contour)
        draw_front(svg, v, {{measured->points, {}, false}}, measured_style);
    svg.raw("</g>");
    svg.rect({v.left, v.top, v.width(), v.height()},
             "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
    Places places;
    for (const geometry::Opening& opening : p.c.mask.openings) {
        for (const auto& [name, place] : p.c.cd_places)
            draw_cd_mark(svg, v, p, opening, name, place.z, places);
        draw_angle_labels(svg, v, p, opening, places);
    }
    if (!p.c.mask.openings.empty() && p.fronts.size() > 2)
        draw_time_labels(svg, v, p, p.c.mask.openings.front().centre_x, places);
}

void draw_depth_axis(Svg& svg, const View& v) {
    const double step = round_length(60 / v.scale_z * 1.4);
    const long first = std::lround(std::ceil(-v.z_high / step));
    const long last = std::lround(std::floor(-v.z_low / step));
    for (long i = first; i <= last; ++i) {
        const double y = v.y(-i * step);
        svg.line(v.left - 6, y, v.left, y, "stroke=\"#222222\" stroke-width=\"1\"");
        svg.text(v.left - 9, y + 4, rounded(i * step, step >= 1 ? 20 : step),
                 {11, Anchor::end, false, "#222222", false, 0});
    }
    svg.text(v.left - 50, v.top + 0.5 * v.height(), "depth below the mask bottom (nm)",
             {11, Anchor::middle, false, "#222222", false, -90});
}

void draw_scale_bars(Svg& svg, const View& v) {
    const auto bar_text = [](double nm) { return rounded(nm, nm >= 1 ? 20 : nm) + " nm"; };
    const double across = round_length(0.4 * (v.x_max - v.x_min));
    const double y = v.bottom() + 18, x = v.left;
    const std::string thick = "stroke=\"#000000\" stroke-width=\"3\"";
    svg.line(x, y, x + across * v.scale_x, y, thick);
    const bool stretched = std::fabs(v.scale_x / v.scale_z - 1) > 1e-9;
    std::string text = bar_text(across);
    svg.text(x + across * v.scale_x + 8, y + 4, text,
             {11, Anchor::start, true, "#000000", false, 0});
    if (!stretched) return;
    svg.text(x, y + 22,
             fmt::format("widths drawn at {:.0f} times the scale of depths", v.scale_x / v.scale_z),
             {11, Anchor::start, true, "#7a1f5c", false, 0});
}

void draw_film_column(Svg& svg, const View& v, const PictureContext& p) {
    struct Label {
        double wanted, y;
        std::string text;
    };
    std::vector<Label> labels;
    const double bar = v.right() + 8;
    for (const geometry::Film& film : p.c.films) {
        const double top = std::min(film.top, v.z_high), bottom = std::max(film.bottom, v.z_low);
        if (top <= bottom) continue;
        const Box band{bar, v.y(top), 9, v.y(bottom) - v.y(top)};
        svg.rect(band, fill(p.looks.at(film.material).colour) +
                           " stroke=\"#000000\" stroke-width=\"0.5\"");
        std::string text = film.name == p.c.materials.at(film.material)
                               ? film.name
                               : film.name + ", " + p.c.materials.at(film.material);
        if (std::isfinite(film.bottom)) text += " " + rounded(film.top - film.bottom, 20) + " nm";
        labels.push_back({band.y + 0.5 * band.height, 0, text});
    }
    const double gap = 15;
    if (labels.size() * gap > v.height()) return; // too many to name: the legend has the materials
    double least = v.top + 8;
    for (Label& label : labels)
        least = (label.y = std::max(label.wanted, least)) + gap;
    double most = v.bottom() - 4;
    for (auto label = labels.rbegin(); label != labels.rend(); ++label)
        most = (label->y = std::min(label->y, most)) - gap;
    for (const Label& label : labels) {
        svg.path(path_data({{bar + 9, label.wanted}, {bar + 15, label.wanted}, {bar + 21, label.y}},
                           false),
                 "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.7\"");
        svg.text(bar + 24, label.y + 4, label.text,
                 {11, Anchor::start, false, "#222222", false, 0});
    }
}

} // namespace rille::engine
