// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

#include <array>

namespace rille::fluxes {

/// Point spread evenly over a quad or triangle {a, b, c, d} (d == c), u and v in [0, 1).
geometry::Vec3 point_on_quad(const geometry::Surface&, int element, double u, double v);

/// Direction by the cosine law about the unit vector `normal`; density cos / pi per solid angle.
geometry::Vec3 cosine_direction(const geometry::Vec3& normal, double u, double v);

} // namespace rille::fluxes
