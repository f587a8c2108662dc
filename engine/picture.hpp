// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/metrics.hpp"
#include "engine/section.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// The front at one time, cut by the picture's section plane.
struct PictureFront {
    double time_s = 0;
    Section section;
};

/// The plane of the picture: y = this [nm], the axis of the first opening (0 in extruded).
double section_y(const Case&);

/// The cross-section as SVG: films as drawn below the front, grown films, the front at several
/// times (`fronts`, in order of time, the first at the start), the final profile, CD marks with
/// values and errors, scale, legends, and one line on what the picture is worth. The layout follows
/// the shape of the section. Where the section is so narrow that it could not be read, widths are
/// stretched by a whole factor, which the picture states.
std::string picture_svg(const Case&, const std::vector<PictureFront>& fronts,
                        const SurfaceState& last, const Metrics&);

/// PNG file of an SVG page, `scale` pixels per px. Throws OutputError if the page cannot be drawn.
std::string png_of(const std::string& svg, double scale);

} // namespace rille::engine
