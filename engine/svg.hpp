// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <string>
#include <vector>

namespace rille::engine {

struct Box {
    double x = 0, y = 0, width = 0, height = 0;
    bool overlaps(const Box& other) const;
};

enum class Anchor { start, middle, end };

/// Text as it is set in a picture.
struct TextStyle {
    double size = 12; ///< [px]
    Anchor anchor = Anchor::start;
    bool bold = false;
    std::string colour = "#222222";
    bool halo = false; ///< a white edge, so that it reads over lines and fills
    double rotate = 0; ///< [deg] about its anchor point
};

/// Writes an SVG page. Coordinates in px, y down. Font DejaVu Sans throughout.
class Svg {
public:
    Svg(double width, double height, const std::string& title);

    double width() const { return width_; }
    double height() const { return height_; }
    void raw(const std::string& markup) { body_ += markup + "\n"; }
    void define(const std::string& markup) { defs_ += markup + "\n"; }
    void line(double x1, double y1, double x2, double y2, const std::string& style);
    void rect(const Box&, const std::string& style);
    /// `style` holds attributes: `fill="none" stroke="#000"`.
    void path(const std::string& data, const std::string& style);
    void text(double x, double y, const std::string& content, const TextStyle&);
    /// What has been drawn so far, without page and definitions.
    const std::string& body() const { return body_; }
    std::string finish() const;

private:
    double width_, height_;
    std::string title_, defs_, body_;
};

/// "M x y L x y ..."; coordinates to 0.01 px.
std::string path_data(const std::vector<std::array<double, 2>>& points, bool closed);
std::string px(double value);            ///< a coordinate, to 0.01 px
std::string escaped(const std::string&); ///< for XML text and attributes
/// Width of a text as set, slightly over-estimated, and the box it takes with its anchor at (x, y).
double text_width(const std::string& content, const TextStyle&);
Box text_box(double x, double y, const std::string& content, const TextStyle&);

} // namespace rille::engine
