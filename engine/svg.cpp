// SPDX-License-Identifier: Apache-2.0
#include "engine/svg.hpp"

#include <cmath>
#include <fmt/format.h>

namespace rille::engine {

bool Box::overlaps(const Box& other) const {
    return x < other.x + other.width && other.x < x + width && y < other.y + other.height &&
           other.y < y + height;
}

Svg::Svg(double width, double height, const std::string& title)
    : width_(width), height_(height), title_(title) {}

void Svg::line(double x1, double y1, double x2, double y2, const std::string& style) {
    body_ += "<line x1=\"" + px(x1) + "\" y1=\"" + px(y1) + "\" x2=\"" + px(x2) + "\" y2=\"" +
             px(y2) + "\" " + style + "/>\n";
}

void Svg::rect(const Box& box, const std::string& style) {
    body_ += "<rect x=\"" + px(box.x) + "\" y=\"" + px(box.y) + "\" width=\"" + px(box.width) +
             "\" height=\"" + px(box.height) + "\" " + style + "/>\n";
}

void Svg::path(const std::string& data, const std::string& style) {
    body_ += "<path d=\"" + data + "\" " + style + "/>\n";
}

void Svg::text(double x, double y, const std::string& content, const TextStyle& style) {
    static constexpr const char* anchors[] = {"start", "middle", "end"};
    std::string common = "<text x=\"" + px(x) + "\" y=\"" + px(y) + "\" font-size=\"" +
                         px(style.size) + "\" text-anchor=\"" +
                         anchors[static_cast<int>(style.anchor)] + "\"";
    if (style.bold) common += " font-weight=\"bold\"";
    if (style.rotate != 0)
        common += " transform=\"rotate(" + px(style.rotate) + " " + px(x) + " " + px(y) + ")\"";
    const std::string end = ">" + escaped(content) + "</text>\n";
    if (style.halo)
        body_ += common +
                 " fill=\"#ffffff\" stroke=\"#ffffff\" stroke-width=\"3.5\" "
                 "stroke-linejoin=\"round\" aria-hidden=\"true\"" +
                 end;
    body_ += common + " fill=\"" + style.colour + "\"" + end;
}

std::string Svg::finish() const {
    return "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
           "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"" +
           px(width_) + "\" height=\"" + px(height_) + "\" viewBox=\"0 0 " + px(width_) + " " +
           px(height_) +
           "\" font-family=\"DejaVu Sans, Verdana, sans-serif\" role=\"img\">\n<title>" +
           escaped(title_) + "</title>\n<defs>\n" + defs_ +
           "</defs>\n<rect x=\"0\" y=\"0\" width=\"" + px(width_) + "\" height=\"" + px(height_) +
           "\" fill=\"#ffffff\"/>\n" + body_ + "</svg>\n";
}

std::string path_data(const std::vector<std::array<double, 2>>& points, bool closed) {
    std::string data;
    for (std::size_t i = 0; i < points.size(); ++i)
        data += (i == 0 ? "M" : "L") + px(points[i][0]) + " " + px(points[i][1]);
    return closed ? data + "Z" : data;
}

std::string px(double value) {
    const double rounded = std::round(value * 100) / 100 + 0.0; // + 0.0 turns -0 into 0
    return fmt::format("{}", rounded);
}

std::string escaped(const std::string& text) {
    std::string out;
    for (const char c : text) {
        if (c == '&')
            out += "&amp;";
        else if (c == '<')
            out += "&lt;";
        else if (c == '>')
            out += "&gt;";
        else if (c == '"')
            out += "&quot;";
        else if (static_cast<unsigned char>(c) < 0x20)
            out += ' '; // XML allows few of them
        else
            out += c;
    }
    return out;
}

double text_width(const std::string& content, const TextStyle& style) {
    double em = 0; // DejaVu Sans: digits 0.636 em, lower case 0.6 on average, narrow signs 0.35
    for (const char c : content) {
        if ((static_cast<unsigned char>(c) & 0xC0) == 0x80) continue;
        em += c == ' ' || c == '.' || c == ',' || c == ':' || c == 'i' || c == 'l' ? 0.33 : 0.64;
    }
    return em * style.size * (style.bold ? 1.1 : 1.0);
}

Box text_box(double x, double y, const std::string& content, const TextStyle& style) {
    const double width = text_width(content, style);
    const double shift = style.anchor == Anchor::start    ? 0
                         : style.anchor == Anchor::middle ? 0.5
                                                          : 1;
    return {x - shift * width, y - 0.8 * style.size, width, 1.05 * style.size};
}

} // namespace rille::engine
