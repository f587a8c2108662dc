// SPDX-License-Identifier: Apache-2.0
// Internal to the picture: the section's frame and what is drawn into it.
#pragma once

#include "engine/case.hpp"
#include "engine/palette.hpp"
#include "engine/picture.hpp"
#include "engine/svg.hpp"

#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// Maps the section (x, z) [nm] to the page.
struct View {
    double x_min = 0, x_max = 1, z_low = 0, z_high = 1; ///< [nm]
    double scale_x = 1, scale_z = 1;                    ///< [px/nm]
    double left = 0, top = 0;                           ///< [px]

    double x(double nm) const { return left + (nm - x_min) * scale_x; }
    double y(double nm) const { return top + (z_high - nm) * scale_z; }
    double width() const { return (x_max - x_min) * scale_x; }
    double height() const { return (z_high - z_low) * scale_z; }
    double right() const { return left + width(); }
    double bottom() const { return top + height(); }
    std::array<double, 2> at(const std::array<double, 2>& p) const { return {x(p[0]), y(p[1])}; }
};

/// One period across (revolved: both sides of the axis) and the section's heights with these shares
/// of them below and above; no larger than `width` by `height` [px], at one scale.
View view_of(const Case&, const Section&, double below, double above, double width, double height);

/// What all parts of the picture share.
struct PictureContext {
    const Case& c;
    const std::vector<PictureFront>& fronts; ///< those that are drawn
    const SurfaceState& last;
    const Section& profile; ///< the final front
    const Metrics& metrics;
    std::vector<MaterialLook> looks;
};

/// Line of the measured contour.
inline constexpr const char* measured_style =
    "stroke=\"#b3006b\" stroke-width=\"1.8\" stroke-dasharray=\"7 3 2 3\"";
/// Colour of front `index` of `count`, light to dark.
std::string front_colour(std::size_t index, std::size_t count);
/// "1.5 s", "40 s".
std::string time_text(double seconds);
/// Beside the time of a picture that is not of the end of its run: ", stopped before its end".
std::string unfinished_words(const Metrics&);
/// The 1-2-5 number nearest below `value`.
double round_length(double value);

/// Outline of the solid below the front as path data: open lines that run from side to side are
/// closed along the bottom; with the even-odd rule voids stay empty and cut-off pieces filled.
std::string solid_path(const View&, const Section&);
/// The films of the stack as they were drawn, over the whole frame.
void draw_films(Svg&, const View&, const PictureContext&);
void draw_grown_films(Svg&, const View&, const PictureContext&);
/// The front as a line; `style` holds the attributes of the stroke.
void draw_front(Svg&, const View&, const Section&, const std::string& style);
/// All of it with CD marks, angles and times.
void draw_section(Svg&, const View&, const PictureContext&);
void draw_depth_axis(Svg&, const View&);
void draw_scale_bars(Svg&, const View&);
void draw_film_column(Svg&, const View&, const PictureContext&);

} // namespace rille::engine
