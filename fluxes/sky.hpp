// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

/// In-plane angles from +z [rad], positive towards +x, between which a point sees the open sky:
/// -pi/2 <= left < right <= pi/2, or dark.
struct SkyInterval {
    double left = 0;
    double right = 0;
    bool dark() const { return !(left < right); }
};

/// Exact visibility of the sky from points of an extruded surface, over sides that continue the
/// period without end. The gas above chain 0 is simply connected, so the visible sky of a point is
/// one interval: left is the largest angle, unwrapped along the way, of the vertices met walking
/// the chain leftwards, right the smallest of those met walking rightwards. One period each way
/// decides, for a vertex above the point only sinks towards the horizon from image to image. Solid
/// pieces that float free of chain 0 cast no shadow here.
class Sky {
public:
    Sky(const geometry::Domain&, const geometry::Surface&);

    /// Whether the element belongs to the chain that is open to the source.
    bool covers(int element) const { return position_[element] >= 0; }
    /// Sky of the point a + t (b - a) of element (a, b), t in [0, 1]; dark where !covers(element).
    SkyInterval at(int element, double t) const;
    /// Mean over the element of the cosine-law flux from the visible sky, relative to the open
    /// flux: (sin(right - psi) - sin(left - psi)) / 2, psi the element's normal; 0 where not
    /// covered.
    double cosine_flux(int element) const;
    /// Sky that every point of the element sees: moving along a segment, towards its end, both
    /// horizons turn to the left, so its start decides the left and its end the right one.
    SkyInterval common(int element) const;

private:
    struct Point {
        double x = 0, z = 0;
    };
    struct Box {
        double x0 = 0, x1 = 0, z0 = 0, z1 = 0;
    };
    class Walk;
    SkyInterval between(int element, double t_left, double t_right) const;
    double horizon(int element, double t, bool rightwards) const;

    geometry::Sides sides_;
    double x_min_ = 0, width_ = 0;
    std::vector<int> position_; ///< of the element along the chain, -1 = not on it
    std::vector<Point> path_;   ///< vertices along the chain, unwrapped; one more than elements
    std::vector<Box> boxes_;    ///< of every block_length consecutive vertices
};

} // namespace rille::fluxes
