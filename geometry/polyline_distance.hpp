// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/vec.hpp"

#include <array>
#include <cstddef>
#include <functional>
#include <optional>
#include <vector>

namespace rille::geometry {

/// Points (x, z) [nm] joined by straight pieces. Walking along it the gas lies on the left.
using Polyline = std::vector<std::array<double, 2>>;

/// Signed distance [nm], < 0 in the solid, to the surface that these lines make in the plane y = 0,
/// continued beyond the sides of the domain: one or more lines that together run once from side to
/// side, and closed ones. Exact up to `reach` [nm], where it is held. Lines must lie in the period
/// and must not cross.
std::function<double(const Vec3&)> polyline_distance(const Domain&, const std::vector<Polyline>&,
                                                     double reach);

/// Where two pieces of lines meet that do not follow each other.
struct PolylineCrossing {
    std::size_t line = 0, piece = 0;             ///< piece p runs from point p to p + 1
    std::size_t other_line = 0, other_piece = 0; ///< comes later
    double x = 0, z = 0;                         ///< [nm]
};
/// The first crossing in the order of the lines; nothing if there is none. Touching counts.
std::optional<PolylineCrossing> find_crossing(const std::vector<Polyline>&);

} // namespace rille::geometry
