// SPDX-License-Identifier: Apache-2.0
#include "fluxes/launch.hpp"

#include <cmath>

namespace rille::fluxes {

using geometry::Vec3;

namespace {

/// The square of the distance from the axis is spread evenly.
Launch launch_from_frustum(const geometry::Surface& s, int element, double u) {
    const Vec3 &a = s.vertices[s.corners[element][0]], &b = s.vertices[s.corners[element][1]];
    const double r = std::sqrt(a.x * a.x + u * (b.x - a.x) * (b.x + a.x));
    const double part = a.x + r > 0 ? u * (a.x + b.x) / (a.x + r) : u;
    return {a + (b - a) * part, s.normal[element]};
}

} // namespace

Launcher::Launcher(const geometry::Surface& s, int element)
    : surface_(s), element_(element), frustum_(s.corners[element][2] < 0) {
    for (int i = 0; i < 2 && !frustum_; ++i) {
        facet_[i] = geometry::facet(s.vertices, s.corners[element], i);
        const Vec3 cross = facet_[i].cross();
        size_[i] = cross.dot(s.normal[element]) > 0 ? cross.length() : 0.0;
        if (size_[i] > 0) normal_[i] = cross / size_[i];
    }
}

double Launcher::area() const {
    return frustum_ ? surface_.area[element_] : 0.5 * (size_[0] + size_[1]);
}

Launch Launcher::operator()(double u, double v) const {
    if (frustum_) return launch_from_frustum(surface_, element_, u);
    const double all = size_[0] + size_[1];
    if (!(all > 0)) return {surface_.centre[element_], surface_.normal[element_]};
    const double share = size_[0] / all;
    const int which = u < share || !(size_[1] > 0) ? 0 : 1;
    const double w = which == 0 ? u / share : (u - share) / (1 - share);
    const double root = std::sqrt(w); // even over the triangle
    const geometry::Facet& f = facet_[which];
    return {f.a + (f.b - f.a) * (root * (1 - v)) + (f.c - f.a) * (root * v), normal_[which]};
}

Launch launch_from(const geometry::Surface& s, int element, double u, double v) {
    return Launcher(s, element)(u, v);
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
