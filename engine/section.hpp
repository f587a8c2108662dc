// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <vector>

namespace rille::engine {

/// Part of a plane section of the front. Points are (x, z) or (x, y) [nm]; `element[i]` is the
/// surface element between points i and i + 1. A closed part repeats its first point at the end.
struct SectionLine {
    std::vector<std::array<double, 2>> points;
    std::vector<int> element;
    bool closed = false;
    std::size_t images = 0; ///< the first segments are images about the axis of revolution
};
using Section = std::vector<SectionLine>;

/// The front in the plane y = `y` as (x, z): in extruded the surface itself, in revolved the
/// section through the axis, both halves. Open lines end at the sides of the period. Order and bits
/// depend on the surface only.
Section vertical_section(const geometry::Domain&, const geometry::Surface&, double y);
/// The front at height z as (x, y); full only.
Section horizontal_section(const geometry::Surface&, double z);

/// Unit normal of the surface at segment i of a line, in the frame of the section.
geometry::Vec3 normal_of(const geometry::Surface&, const SectionLine&, std::size_t i);

/// Nearest crossings of a height (second coordinate) left and right of x; false if either is
/// missing.
bool walls_at(const Section&, double height, double x, double& left, double& right);

} // namespace rille::engine
