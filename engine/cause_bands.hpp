// SPDX-License-Identifier: Apache-2.0
// Internal to pictures: what made a rate or a removal, as bands on top of each other.
#pragma once

#include "engine/section.hpp"
#include "engine/svg.hpp"
#include "fluxes/causes.hpp"

#include <array>
#include <functional>
#include <string>
#include <vector>

namespace rille::engine {

/// The part of a section that is open to the source, as places along it.
struct SectionWalk {
    std::vector<int> element;
    std::vector<char> is_image;                ///< in the other half about an axis of revolution
    std::vector<double> arc;                   ///< [nm] from its start to the middle of each piece
    std::vector<std::array<double, 2>> middle; ///< (x, z) [nm]
    double length = 0;                         ///< [nm]
};
/// The longest line of the section.
SectionWalk longest_walk(const Section&);

/// Markup that the bands need in the definitions of a page.
std::string cause_hatch();

/// Draws bands[cause][point] on top of each other, those above 0 from 0 upwards and those below 0
/// downwards. `place(point, value)` is where a value stands on the page.
void draw_cause_bands(Svg&, const fluxes::CauseFields& bands,
                      const std::function<std::array<double, 2>(std::size_t, double)>& place);

/// Least and largest sum of the bands, 0 included.
std::array<double, 2> band_range(const fluxes::CauseFields& bands);

/// Causes that are anywhere more than `least`, with their looks, from (x, y) downwards; returns the
/// height used.
double draw_cause_legend(Svg&, const fluxes::CauseFields& bands, double least, double x, double y);

/// Straight axes with a few round ticks.
struct AxisScale {
    double low = 0, high = 1;
    bool logarithmic = false;
    double part(double value) const; ///< 0 at low, 1 at high; clamped below low if logarithmic
    std::vector<double> ticks(int about) const;
};

} // namespace rille::engine
