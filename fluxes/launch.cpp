// SPDX-License-Identifier: Apache-2.0
#include "fluxes/launch.hpp"

#include <cmath>

namespace rille::fluxes {

using geometry::Vec3;

geometry::Vec3 point_on_quad(const geometry::Surface& s, int element, double u, double v) {
    const auto& corner = s.corners[element];
    const Vec3 a = s.vertices[corner[0]], b = s.vertices[corner[1]];
    const Vec3 c = s.vertices[corner[2]], d = s.vertices[corner[3]];
    const double first = (b - a).cross(c - a).length(), second = (c - a).cross(d - a).length();
    const double share = first / (first + second);
    const bool in_first = u < share || !(second > 0);
    const double w = in_first ? u / share : (u - share) / (1 - share);
    const double root = std::sqrt(w); // even over the triangle a, p, q
    const Vec3 p = in_first ? b : c, q = in_first ? c : d;
    return a + (p - a) * (root * (1 - v)) + (q - a) * (root * v);
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
