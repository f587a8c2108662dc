// SPDX-License-Identifier: Apache-2.0
// First hits of in-plane rays on an extruded polyline, segment by segment: slow and obvious.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <cmath>

namespace rille::tests {

/// Element hit first by the ray from `origin` along the in-plane angle phi [rad] (from +z towards
/// +x), or -1 for the open. Sides are handled by images of the surface out to `images` periods.
inline int brute_hit(const geometry::Domain& domain, const geometry::Surface& s,
                     const geometry::Vec3& origin, double phi, int from, int images = 40) {
    const double dx = std::sin(phi), dz = std::cos(phi);
    const bool mirror = domain.sides == geometry::Sides::mirror;
    double best = 1e300;
    int hit = -1;
    for (int image = -images; image <= images; ++image) {
        const bool flipped = mirror && image % 2 != 0;
        for (int e = 0; e < int(s.size()); ++e) {
            if (e == from && image == 0) continue;
            auto a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            if (flipped) a.x = -a.x, b.x = -b.x; // the period is centred on x = 0
            a.x += image * domain.width_x(), b.x += image * domain.width_x();
            const double ex = b.x - a.x, ez = b.z - a.z, det = dx * ez - dz * ex;
            if (det == 0) continue;
            const double ax = a.x - origin.x, az = a.z - origin.z;
            const double t = (ax * ez - az * ex) / det, u = (ax * dz - az * dx) / det;
            if (t > 1e-9 && t < best && u >= 0 && u < 1) best = t, hit = e;
        }
    }
    return hit;
}

} // namespace rille::tests
