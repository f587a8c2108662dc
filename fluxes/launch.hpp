// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

namespace rille::fluxes {

/// A place from which a ray leaves an element of a full surface.
struct Launch {
    geometry::Vec3 point;
    geometry::Vec3 normal; ///< of the facet that the point lies on
};

/// Place spread evenly over the facets of an element, u and v in [0, 1). Of an element without area
/// it is the centre.
Launch launch_from_quad(const geometry::Surface&, int element, double u, double v);

/// Area [nm^2] of the facets over which launch_from_quad spreads.
double launch_area(const geometry::Surface&, int element);

/// Direction by the cosine law about the unit vector `normal`; density cos / pi per solid angle.
geometry::Vec3 cosine_direction(const geometry::Vec3& normal, double u, double v);

} // namespace rille::fluxes
