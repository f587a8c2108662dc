// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_parts.hpp"

#include <array>
#include <cmath>
#include <cstdlib>
#include <fmt/format.h>

namespace rille::engine {
namespace {

struct Look {
    const char* colour;
    const char* dashes;
};
constexpr std::array<Look, 8> looks = {{{"#102460", ""},
                                        {"#c8662a", "5 2"},
                                        {"#1f7a6d", "2 1.5"},
                                        {"#8c4c8c", "6 2 1.5 2"},
                                        {"#5f8fc9", ""},
                                        {"#9a7400", "3 2"},
                                        {"#55555f", "8 2"},
                                        {"#b8426a", "1.2 1.6"}}};

/// Light sand to dark blue; lightness L* falls evenly.
constexpr std::array<std::array<int, 3>, 6> heat = {{{0xf6, 0xf0, 0xdc},
                                                     {0xc9, 0xdc, 0xc8},
                                                     {0x8f, 0xbd, 0xbe},
                                                     {0x4f, 0x93, 0xb0},
                                                     {0x25, 0x62, 0x97},
                                                     {0x10, 0x24, 0x60}}};

std::string polygon(int corners, double radius, double turn_deg) {
    std::vector<std::array<double, 2>> points;
    for (int i = 0; i < corners; ++i) {
        const double a = (turn_deg + 360.0 * i / corners) * std::acos(-1.0) / 180;
        points.push_back({radius * std::cos(a), radius * std::sin(a)});
    }
    return path_data(points, true);
}

std::string bar(double half_width, double half_height) {
    return path_data({{-half_width, -half_height},
                      {half_width, -half_height},
                      {half_width, half_height},
                      {-half_width, half_height}},
                     true);
}

std::string star(double radius) {
    std::vector<std::array<double, 2>> points;
    for (int i = 0; i < 8; ++i) {
        const double a = i * std::acos(-1.0) / 4, r = i % 2 ? 0.4 * radius : radius;
        points.push_back({r * std::cos(a), r * std::sin(a)});
    }
    return path_data(points, true);
}

} // namespace

LineLook line_look(std::size_t index) {
    const Look& look = looks[index % looks.size()];
    // The second round of colours has the markers shifted, so that no two lines are alike.
    const std::size_t round = index / looks.size();
    return {look.colour, look.dashes, static_cast<int>((index + 3 * round) % 8)};
}

std::string heat_colour(double share) {
    const double place = std::min(1.0, std::max(0.0, share)) * (heat.size() - 1);
    const std::size_t i = std::min<std::size_t>(static_cast<std::size_t>(place), heat.size() - 2);
    const auto mix = [&](int c) {
        return static_cast<int>(std::lround(heat[i][c] + (place - static_cast<double>(i)) *
                                                             (heat[i + 1][c] - heat[i][c])));
    };
    return fmt::format("#{:02x}{:02x}{:02x}", mix(0), mix(1), mix(2));
}

std::string marker_path(int marker, double r) {
    switch (marker) {
    case 0:
        return fmt::format("M{0} 0A{1} {1} 0 1 0 {2} 0A{1} {1} 0 1 0 {0} 0Z", px(-r), px(r), px(r));
    case 1:
        return bar(0.86 * r, 0.86 * r);
    case 2:
        return polygon(3, 1.25 * r, -90);
    case 3:
        return polygon(4, 1.2 * r, 0);
    case 4:
        return polygon(3, 1.25 * r, 90);
    case 5:
        return star(1.5 * r);
    case 6:
        return bar(1.2 * r, 0.5 * r);
    default:
        return bar(0.5 * r, 1.2 * r);
    }
}

std::string open_group(const std::string& key, const std::string& words) {
    if (key.empty() && words.empty()) return "<g>";
    std::string tag = "<g";
    if (!key.empty()) tag += " class=\"point\" data-point=\"" + escaped(key) + "\"";
    tag += ">";
    if (!words.empty()) tag += "<title>" + escaped(words) + "</title>";
    return tag;
}

std::string close_group() {
    return "</g>";
}

std::string line_stroke(const LineLook& look, double width) {
    std::string style = fmt::format("stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\"",
                                    look.colour, px(width));
    if (look.dashes.empty()) return style;
    std::string dashes;
    const char* at = look.dashes.c_str();
    for (char* end = nullptr;; at = end) {
        const double length = std::strtod(at, &end);
        if (end == at) break;
        dashes += (dashes.empty() ? "" : " ") + px(length * width);
    }
    return style + " stroke-dasharray=\"" + dashes + "\"";
}

void draw_swatch(Svg& svg, const Sheet& sheet, const LegendEntry& entry, double x, double y,
                 double length) {
    const double r = sheet.size.marker, middle = x + 0.5 * length;
    if (entry.is_measured) {
        svg.path(path_data({{middle - r, y - r}, {middle + r, y + r}}, false) +
                     path_data({{middle - r, y + r}, {middle + r, y - r}}, false),
                 "fill=\"none\" stroke=\"" + entry.look.colour + "\" stroke-width=\"" +
                     px(1.2 * sheet.size.line) + "\"");
        return;
    }
    if (entry.has_line)
        svg.path(path_data({{x, y}, {x + length, y}}, false),
                 "fill=\"none\" " + line_stroke(entry.look, sheet.size.line));
    if (entry.has_marker)
        svg.path(marker_path(entry.look.marker, r),
                 fmt::format("fill=\"{}\" transform=\"translate({} {})\"", entry.look.colour,
                             px(middle), px(y)));
}

double draw_legend(Svg* svg, const Sheet& sheet, const std::vector<LegendEntry>& entries, double x,
                   double y, double width) {
    const TextStyle style = sheet.body();
    const double swatch = 2.6 * style.size, gap = 0.6 * style.size, row = 1.55 * style.size;
    double at = x, top = y;
    for (const LegendEntry& entry : entries) {
        const std::string name = shortened(entry.name, style, width - swatch - gap);
        const double wide = swatch + gap + text_width(name, style);
        if (at > x && at + wide > x + width) {
            at = x;
            top += row;
        }
        if (svg) {
            draw_swatch(*svg, sheet, entry, at, top + 0.65 * row, swatch);
            svg->text(at + swatch + gap, top + 0.65 * row + 0.35 * style.size, name, style);
        }
        at += wide + 1.6 * style.size;
    }
    return entries.empty() ? 0 : top - y + row;
}

std::string section_path(const Section& section, const SectionView& view) {
    std::string data;
    for (const SectionLine& line : section) {
        std::vector<std::array<double, 2>> points = line.points;
        for (auto& p : points)
            p = view.at(p);
        data += path_data(points, line.closed);
    }
    return data;
}

void add_extent(const Section& section, DataRange& x, DataRange& z) {
    for (const SectionLine& line : section)
        for (const auto& p : line.points) {
            x.add(p[0]);
            z.add(p[1]);
        }
}

} // namespace rille::engine
