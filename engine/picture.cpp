// SPDX-License-Identifier: Apache-2.0
#include "engine/picture.hpp"

#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/run_record.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <functional>

namespace rille::engine {
namespace {

constexpr double margin = 28, axis_room = 66, panel_width = 330, panel_gap = 30, head = 84;
constexpr double tallest = 800, widest = 1000, narrowest = 240, landscape_from = 560;
constexpr std::size_t most_fronts = 8;

using Draw = std::function<double(Svg&, double, double)>; ///< draws at (x, y), returns its height

/// At most most_fronts of them: the first, the last, and even steps between.
std::vector<PictureFront> chosen_fronts(const std::vector<PictureFront>& all) {
    if (all.size() <= most_fronts) return all;
    std::vector<PictureFront> chosen;
    for (std::size_t i = 0; i < most_fronts; ++i)
        chosen.push_back(all[i * (all.size() - 1) / (most_fronts - 1)]);
    return chosen;
}

View make_view(const PictureContext& p) {
    View v;
    v.x_min = -p.c.domain.x_max();
    v.x_max = p.c.domain.x_max();
    double low = 0, high = 0;
    const auto include = [&](const Section& section) {
        for (const SectionLine& line : section)
            for (const auto& point : line.points) {
                low = std::min(low, point[1]);
                high = std::max(high, point[1]);
            }
    };
    include(p.profile);
    for (const PictureFront& front : p.fronts)
        include(front.section);
    const double extent = std::max(high - low, 0.1 * (v.x_max - v.x_min));
    v.z_low = low - 0.14 * extent;
    v.z_high = high + 0.06 * extent;
    const double height = v.z_high - v.z_low, width = v.x_max - v.x_min;
    v.scale_z = std::min(tallest / height, widest / width);
    v.scale_x = v.scale_z;
    if (v.width() >= landscape_from) // the panel goes below: leave it room
        v.scale_x = v.scale_z = std::min(560 / height, widest / width);
    const double stretch = std::ceil(narrowest / v.width() - 1e-9);
    if (v.width() < 0.7 * narrowest) v.scale_x *= stretch;
    v.left = margin + axis_room;
    v.top = head;
    return v;
}

double film_column_room(const PictureContext& p) {
    double room = 0;
    for (const geometry::Film& film : p.c.films)
        room = std::max(room,
                        text_width(film.name + ", " + p.c.materials.at(film.material) + " 0000 nm",
                                   {11, Anchor::start, false, "", false, 0}));
    return std::min(room, 240.0) + 36;
}

double heading(Svg& svg, double x, double y, const std::string& text) {
    svg.text(x, y + 12, text, {12, Anchor::start, true, "#222222", false, 0});
    svg.line(x, y + 18, x + panel_width, y + 18, "stroke=\"#999999\" stroke-width=\"0.8\"");
    return 36;
}

double draw_measured(Svg& svg, const PictureContext& p, double x, double y) {
    const bool several = p.c.mask.openings.size() > 1;
    double at = y + heading(svg, x, y, "Measured");
    int rows = 0;
    for (const Metric& m : p.metrics.metrics) {
        if (!m.value || m.name.find("cd_") != std::string::npos) continue;
        if (++rows > 22) {
            svg.text(x, at, "more in metrics.json",
                     {11, Anchor::start, false, "#555555", false, 0});
            at += 17;
            break;
        }
        std::string name = m.name;
        for (std::size_t cd = name.find("cd"); cd != std::string::npos;
             cd = name.find("cd", cd + 2))
            if (name != "cd_change") name.replace(cd, 2, "CD");
        const std::string unit = m.unit == "1" ? "" : m.unit == "deg" ? "°" : " " + m.unit;
        svg.text(x, at, several ? m.feature + ": " + name : name,
                 {11.5, Anchor::start, false, "#222222", false, 0});
        svg.text(x + panel_width, at, value_text(m) + unit,
                 {11.5, Anchor::end, false, "#222222", false, 0});
        at += 17;
    }
    for (const Metrics::Clearing& film : p.metrics.clearing) {
        svg.text(x, at, (several ? film.feature + ": " : std::string()) + film.film,
                 {11.5, Anchor::start, false, "#222222", false, 0});
        svg.text(x + panel_width, at,
                 film.cleared ? "cleared" : rounded(film.remaining_nm) + " nm left",
                 {11.5, Anchor::end, false, "#222222", false, 0});
        at += 17;
    }
    svg.text(x, at + 2,
             p.metrics.has_grid_errors() ? "± 95 % sampling error ± bound on grid error"
                                         : "± 95 % sampling error; grid error not assessed",
             {10, Anchor::start, false, "#555555", false, 0});
    return at + 16 - y;
}

double draw_targets(Svg& svg, const PictureContext& p, double x, double y) {
    double at = y + heading(svg, x, y, "Targets");
    for (const TargetVerdict& v : p.metrics.targets) {
        const bool several = p.c.mask.openings.size() > 1 && !v.feature.empty();
        svg.text(x, at, several ? v.feature + ": " + v.target : v.target,
                 {11.5, Anchor::start, false, "#222222", false, 0});
        svg.text(x + panel_width, at, verdict_name(v.verdict),
                 {11.5, Anchor::end, true, "#222222", false, 0});
        if (v.by_numbers != v.verdict) { // the parameters keep it open
            at += 14;
            svg.text(x + panel_width, at,
                     std::string(verdict_name(v.by_numbers)) +
                         " by the numbers; parameters illustrative or from memory",
                     {10, Anchor::end, false, "#555555", false, 0});
        }
        at += 17;
    }
    return at - y;
}

double draw_materials(Svg& svg, const PictureContext& p, double x, double y) {
    double at = y + heading(svg, x, y, "Materials");
    std::vector<int> shown;
    const auto show = [&](int material, const std::string& note) {
        if (std::find(shown.begin(), shown.end(), material) != shown.end()) return;
        shown.push_back(material);
        const Box swatch{x, at - 11, 26, 14};
        const std::string edge = "stroke=\"#000000\" stroke-width=\"0.6\"";
        svg.rect(swatch, "fill=\"" + p.looks.at(material).colour + "\"");
        svg.rect(swatch, p.looks.at(material).hatch
                             ? fmt::format("fill=\"url(#hatch{})\" {}", material, edge)
                             : "fill=\"none\" " + edge);
        svg.text(x + 36, at, p.c.materials.at(material) + note,
                 {11.5, Anchor::start, false, "#222222", false, 0});
        at += 20;
    };
    for (const geometry::Film& film : p.c.films)
        show(film.material, "");
    for (std::size_t f = 0; f < p.last.grown.material.size(); ++f) {
        const auto& thickness = p.last.grown.thickness[f];
        if (std::any_of(thickness.begin(), thickness.end(), [](double t) { return t > 1e-3; }))
            show(p.last.grown.material[f], " (grown)");
    }
    return at - y;
}

double draw_times(Svg& svg, const PictureContext& p, double x, double y) {
    double at = y + heading(svg, x, y, "Front");
    const std::size_t count = p.fronts.size();
    const std::size_t rows = (count + 1) / 2;
    for (std::size_t f = 0; f < count; ++f) {
        const double column = x + (f / rows) * 0.5 * panel_width, row = at + (f % rows) * 18.0;
        const bool last = f + 1 == count;
        svg.line(column, row - 4, column + 26, row - 4,
                 last ? std::string("stroke=\"#000000\" stroke-width=\"2.2\"")
                      : fmt::format("stroke=\"{}\" stroke-width=\"1.4\"{}", front_colour(f, count),
                                    f == 0 ? " stroke-dasharray=\"5 3\"" : ""));
        svg.text(column + 36, row,
                 f == 0 && count > 1 ? "start"
                                     : time_text(p.fronts[f].time_s) + (last ? " (end)" : ""),
                 {11.5, Anchor::start, last, "#222222", false, 0});
    }
    at += rows * 18.0;
    if (p.c.measured.contour) {
        svg.line(x, at - 4, x + 26, at - 4, measured_style);
        svg.text(x + 36, at, "measured contour", {11.5, Anchor::start, false, "#222222", false, 0});
        at += 18;
    }
    return at + 4 - y;
}

double draw_plan(Svg& svg, const PictureContext& p, double x, double y) {
    double at = y + heading(svg, x, y, "Plan view");
    const geometry::Domain& d = p.c.domain;
    const double size = 190, scale = size / std::max(d.width_x(), d.width_y());
    const Metric* depth = p.metrics.find("depth centre");
    const double middle = depth && depth->value ? -0.5 * *depth->value : -d.spacing;
    const Box frame{x, at - 10, d.width_x() * scale, d.width_y() * scale};
    svg.rect(frame, "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
    // Half a cell up, in the mask: an unetched floor lies at z = 0 itself.
    const std::pair<double, const char*> cuts[] = {
        {0.5 * d.spacing, "stroke=\"#000000\" stroke-width=\"1.8\""},
        {middle, "stroke=\"#2b6cb0\" stroke-width=\"1.8\" "
                 "stroke-dasharray=\"6 3\""}};
    for (const auto& [z, style] : cuts)
        for (const SectionLine& line : horizontal_section(p.last.surface, z)) {
            auto points = line.points;
            for (auto& q : points)
                q = {frame.x + (q[0] - d.x_min()) * scale, frame.y + (-d.y_min() - q[1]) * scale};
            svg.path(path_data(points, line.closed), std::string("fill=\"none\" ") + style);
        }
    const double line_y = frame.y + (-d.y_min() - section_y(p.c)) * scale;
    svg.line(frame.x, line_y, frame.x + frame.width, line_y,
             "stroke=\"#7a1f5c\" stroke-width=\"0.8\" stroke-dasharray=\"2 3\"");
    const TextStyle small{10.5, Anchor::start, false, "#222222", false, 0};
    const double text_x = frame.x + frame.width + 10;
    svg.line(text_x, frame.y + 12, text_x + 22, frame.y + 12, cuts[0].second);
    svg.text(text_x + 28, frame.y + 16, "mask bottom", small);
    svg.line(text_x, frame.y + 32, text_x + 22, frame.y + 32, cuts[1].second);
    svg.text(text_x + 28, frame.y + 36, rounded(-middle, 20) + " nm deep", small);
    svg.line(text_x, frame.y + 52, text_x + 22, frame.y + 52,
             "stroke=\"#7a1f5c\" stroke-width=\"0.8\" stroke-dasharray=\"2 3\"");
    svg.text(text_x + 28, frame.y + 56, "section", small);
    return frame.y + frame.height + 12 - y;
}

/// The size at which a text fits a width, at most `size`.
double fitting(const std::string& text, double size, bool bold, double width) {
    const double wide = text_width(text, {size, Anchor::start, bold, "", false, 0});
    return wide > width ? size * width / wide : size;
}

std::string subtitle(const PictureContext& p) {
    std::string text = "after " + time_text(p.last.time_s) + unfinished_words(p.metrics);
    if (!p.c.chemistry.empty()) text += " · " + p.c.chemistry;
    if (p.c.domain.revolved()) text += " · section through the axis";
    if (!p.c.domain.planar_contour())
        text += " · section at y = " + rounded(section_y(p.c), 20) + " nm";
    return text + " · spacing " + rounded(p.c.domain.spacing) + " nm";
}

void draw_head_and_foot(Svg& svg, const PictureContext& p) {
    const double room = svg.width() - 2 * margin;
    svg.text(margin, 40, p.c.title,
             {fitting(p.c.title, 20, true, room), Anchor::start, true, "#111111", false, 0});
    const std::string below = subtitle(p);
    svg.text(margin, 62, below,
             {fitting(below, 12.5, false, room), Anchor::start, false, "#444444", false, 0});
    const std::string line = "model prediction, not a released recipe · " + standing_line(p.c) +
                             " · errors shown are numerical only";
    svg.line(margin, svg.height() - 30, svg.width() - margin, svg.height() - 30,
             "stroke=\"#999999\" stroke-width=\"0.6\"");
    svg.text(margin, svg.height() - 13, line,
             {fitting(line, 10.5, false, room), Anchor::start, false, "#444444", false, 0});
}

std::vector<Draw> panel_parts(const PictureContext& p) {
    std::vector<Draw> parts = {
        [&p](Svg& svg, double x, double y) { return draw_measured(svg, p, x, y); }};
    if (!p.metrics.targets.empty())
        parts.emplace_back(
            [&p](Svg& svg, double x, double y) { return draw_targets(svg, p, x, y); });
    parts.emplace_back([&p](Svg& svg, double x, double y) { return draw_materials(svg, p, x, y); });
    parts.emplace_back([&p](Svg& svg, double x, double y) { return draw_times(svg, p, x, y); });
    if (!p.c.domain.planar_contour())
        parts.emplace_back([&p](Svg& svg, double x, double y) { return draw_plan(svg, p, x, y); });
    return parts;
}

} // namespace

std::string front_colour(std::size_t index, std::size_t count) {
    const double t = count > 1 ? static_cast<double>(index) / static_cast<double>(count - 1) : 1;
    const auto mix = [t](int light, int dark) {
        return static_cast<int>(std::lround(light + t * (dark - light)));
    };
    return fmt::format("#{:02x}{:02x}{:02x}", mix(0x9f, 0x10), mix(0xb4, 0x24), mix(0xd8, 0x60));
}

std::string unfinished_words(const Metrics& metrics) {
    return metrics.is_final ? "" : ", stopped before its end";
}

std::string time_text(double seconds) {
    return fmt::format(
        seconds < 100 && std::fabs(seconds - std::round(seconds)) > 0.005 ? "{:.1f} s" : "{:.0f} s",
        seconds);
}

double round_length(double value) {
    const double power = std::pow(10.0, std::floor(std::log10(value)));
    for (const double step : {5.0, 2.0})
        if (value / power >= step) return step * power;
    return power;
}

double section_y(const Case& c) {
    return c.domain.planar_contour() || c.mask.openings.empty() ? 0
                                                                : c.mask.openings.front().centre_y;
}

std::string picture_svg(const Case& c, const std::vector<PictureFront>& fronts,
                        const SurfaceState& last, const Metrics& metrics) {
    const Section profile = vertical_section(c.domain, last.surface, section_y(c));
    const std::vector<PictureFront> chosen = chosen_fronts(fronts);
    const PictureContext p{c, chosen, last, profile, metrics, material_looks(c.materials)};
    const View v = make_view(p);
    const bool landscape = v.width() >= landscape_from;
    const std::vector<Draw> parts = panel_parts(p);
    const double section_right = v.right() + film_column_room(p);

    // The parts' heights are known only by drawing them: once on a scratch page.
    Svg scratch(1, 1, "");
    std::vector<double> heights;
    for (const Draw& part : parts)
        heights.push_back(part(scratch, 0, 0));
    double total = 0, highest = 0;
    for (const double height : heights) {
        total += height + 14;
        highest = std::max(highest, height);
    }
    const double columns = static_cast<double>(parts.size());
    const double panel_x = landscape ? margin : section_right + panel_gap;
    const double panel_y = landscape ? v.bottom() + 66 : v.top;
    const double width = landscape
                             ? std::max(section_right + margin, 2 * margin + columns * panel_width +
                                                                    (columns - 1) * panel_gap)
                             : panel_x + panel_width + margin;
    const double height =
        (landscape ? panel_y + highest : std::max(v.bottom() + 56, panel_y + total)) + 44;
    Svg svg(std::ceil(width), std::ceil(height), c.title);
    for (std::size_t m = 0; m < p.looks.size(); ++m)
        svg.define(hatch_pattern("hatch" + std::to_string(m), p.looks[m]));
    draw_section(svg, v, p);
    draw_depth_axis(svg, v);
    draw_scale_bars(svg, v);
    draw_film_column(svg, v, p);
    double x = panel_x, y = panel_y;
    for (std::size_t i = 0; i < parts.size(); ++i) {
        parts[i](svg, x, y);
        if (landscape)
            x += panel_width + panel_gap;
        else
            y += heights[i] + 14;
    }
    draw_head_and_foot(svg, p);
    return svg.finish();
}

} // namespace rille::engine
