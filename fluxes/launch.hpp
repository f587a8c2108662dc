// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

namespace rille::fluxes {

/// A place from which a ray leaves an element of a full or revolved surface.
struct Launch {
    geometry::Vec3 point;
    geometry::Vec3 normal; ///< of the facet that the point lies on
};

/// Place spread evenly over the facets of an element, u and v in [0, 1); revolved: over its
/// frustum, in the half-plane y = 0, x >= 0 (u alone counts). Of an element without area it is the
/// centre.
Launch launch_from(const geometry::Surface&, int element, double u, double v);

/// Area [nm^2] of the facets, or the frustum, over which launch_from spreads.
double launch_area(const geometry::Surface&, int element);

/// Direction by the cosine law about the unit vector `normal`; density cos / pi per solid angle.
geometry::Vec3 cosine_direction(const geometry::Vec3& normal, double u, double v);

} // namespace rille::fluxes
