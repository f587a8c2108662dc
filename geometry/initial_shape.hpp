// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/vec.hpp"

#include <functional>
#include <optional>
#include <string>
#include <vector>

namespace rille::geometry {

/// One opening through the mask, or a copy of it in an array. Widths are full widths at the mask
/// bottom (z = 0) [nm]; the sidewall angle makes them wider (below 90 deg) or narrower above.
struct Opening {
    enum class Shape { trench, round, elliptic };
    std::string name;
    Shape shape = Shape::trench;
    double width_x = 0;  ///< full width along x at z = 0 [nm]
    double width_y = 0;  ///< full width along y at z = 0 [nm]; unused for a trench (runs along y)
    double centre_x = 0; ///< [nm], anywhere in the period
    double centre_y = 0; ///< [nm]
};

/// The mask as drawn: a slab 0 <= z <= thickness with openings.
struct MaskShape {
    double thickness = 0;           ///< [nm]; 0 = no mask
    double sidewall_angle_deg = 90; ///< (0, 180); 90 vertical, below 90 opens upwards
    double corner_radius = 0;       ///< [nm] rounding of the top edge
    std::vector<Opening> openings;
};

/// Signed distance [nm] to the initial solid {z <= 0} united with the mask, < 0 inside, exact near
/// the surface (an ellipse's to 1e-6 of its width), repeated beyond the sides of the domain.
/// `offset` >= 0 [nm] grows the solid outwards (a conformal liner).
std::function<double(const Vec3&)> initial_distance(const Domain&, const MaskShape&,
                                                    double offset = 0);

} // namespace rille::geometry
