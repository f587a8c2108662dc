// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/facets.hpp"
#include "geometry/surface.hpp"

namespace rille::fluxes {

/// A place from which a ray leaves an element of a full or revolved surface.
struct Launch {
    geometry::Vec3 point;
    geometry::Vec3 normal; ///< of the facet that the point lies on
};

/// The places of one element from which rays leave: over its facets; revolved: over its frustum, in
/// the half-plane y = 0, x >= 0. A facet folded over its neighbour looks into the solid, nothing
/// starts there.
class Launcher {
public:
    Launcher(const geometry::Surface&, int element);

    /// Place spread evenly, u and v in [0, 1); revolved: u alone counts. Of an element without area
    /// it is the centre.
    Launch operator()(double u, double v) const;
    /// [nm^2] over which they are spread.
    double area() const;

private:
    const geometry::Surface& surface_;
    int element_;
    bool frustum_;
    geometry::Facet facet_[2];
    geometry::Vec3 normal_[2];
    double size_[2] = {0, 0}; ///< twice their areas, as far as they count
};

/// One place.
Launch launch_from(const geometry::Surface&, int element, double u, double v);

/// Direction by the cosine law about the unit vector `normal`; density cos / pi per solid angle.
geometry::Vec3 cosine_direction(const geometry::Vec3& normal, double u, double v);

} // namespace rille::fluxes
