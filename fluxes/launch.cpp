// SPDX-License-Identifier: Apache-2.0
#include "fluxes/launch.hpp"

#include "geometry/facets.hpp"

#include <cmath>

namespace rille::fluxes {

using geometry::Vec3;

namespace {

/// The two facets of a quad, twice their areas along their normals, and how much of them counts: a
/// facet folded over its neighbour looks into the solid, nothing starts there.
struct Facets {
    geometry::Facet facet[2];
    Vec3 cross[2];
    double size[2];

    Facets(const geometry::Surface& s, int element) {
        for (int i = 0; i < 2; ++i) {
            facet[i] = geometry::facet(s.vertices, s.corners[element], i);
            cross[i] = facet[i].cross();
            size[i] = cross[i].dot(s.normal[element]) > 0 ? cross[i].length() : 0.0;
        }
    }
};

/// The square of the distance from the axis is spread evenly.
Launch launch_from_frustum(const geometry::Surface& s, int element, double u) {
    const Vec3 &a = s.vertices[s.corners[element][0]], &b = s.vertices[s.corners[element][1]];
    const double r = std::sqrt(a.x * a.x + u * (b.x - a.x) * (b.x + a.x));
    const double part = a.x + r > 0 ? u * (a.x + b.x) / (a.x + r) : u;
    return {a + (b - a) * part, s.normal[element]};
}

} // namespace

double launch_area(const geometry::Surface& surface, int element) {
    if (surface.corners[element][2] < 0) return surface.area[element];
    const Facets facets(surface, element);
    return 0.5 * (facets.size[0] + facets.size[1]);
}

Launch launch_from(const geometry::Surface& s, int element, double u, double v) {
    if (s.corners[element][2] < 0) return launch_from_frustum(s, element, u);
    const Facets facets(s, element);
    const auto& [both, cross, size] = facets;
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
