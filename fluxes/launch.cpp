// SPDX-License-Identifier: Apache-2.0
#include "fluxes/launch.hpp"

#include "geometry/facets.hpp"

#include <cmath>

namespace rille::fluxes {

using geometry::Vec3;

Launch launch_from_quad(const geometry::Surface& s, int element, double u, double v) {
    const geometry::Facet both[2] = {geometry::facet(s.vertices, s.corners[element], 0),
                                     geometry::facet(s.vertices, s.corners[element], 1)};
    const Vec3 cross[2] = {both[0].cross(), both[1].cross()};
    // A facet folded over its neighbour looks into the solid: nothing starts there.
    const auto facing = [&](const Vec3& c) {
        return c.dot(s.normal[element]) > 0 ? c.length() : 0.0;
    };
    const double size[2] = {facing(cross[0]), facing(cross[1])};
    const double all = size[0] + size[1];
    if (!(all > 0)) return {s.centre[element], s.normal[element]};
    const double share = size[0] / all;
    const int which = u < share || !(size[1] > 0) ? 0 : 1;
    const double w = which == 0 ? u / share : (u - share) / (1 - share);
    const double root = std::sqrt(w); // even over the triangle
    const geometry::Facet& f = both[which];
    return {f.a + (f.b - f.a) * (root * (1 - v)) + (f.c - f.a) * (root * v),
            cross[which] / size[which]};
}

geometry::Vec3 cosine_direction(const geometry::Vec3& n, double u, double v) {
    const double sine = std::sqrt(u), cosine = std::sqrt(1 - u);
    const double azimuth = 2 * 3.14159265358979323846 * v;
    const Vec3 helper = std::fabs(n.z) < 0.7 ? Vec3(0, 0, 1) : Vec3(1, 0, 0);
    const Vec3 t1 = helper.cross(n).normalized(), t2 = n.cross(t1);
    return (t1 * (sine * std::cos(azimuth)) + t2 * (sine * std::sin(azimuth)) + n * cosine)
        .normalized();
}

} // namespace rille::fluxes
