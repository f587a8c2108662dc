// SPDX-License-Identifier: Apache-2.0
// Exact surfaces for tests of rays and fluxes: no grid, no contouring.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

namespace rille::tests {

using geometry::Domain;
using geometry::Surface;
using geometry::Vec3;

inline void add_element(Surface& s, const std::array<int, 4>& corners) {
    const Vec3 a = s.vertices[corners[0]], b = s.vertices[corners[1]];
    s.corners.push_back(corners);
    s.chain.push_back(0);
    if (corners[2] < 0) { // segment
        const Vec3 along = b - a;
        s.centre.push_back((a + b) * 0.5);
        s.area.push_back(along.length());
        s.normal.push_back(Vec3(-along.z, 0, along.x) / along.length());
        return;
    }
    const Vec3 c = s.vertices[corners[2]], d = s.vertices[corners[3]];
    const Vec3 cross = (c - a).cross(d - b) * 0.5;
    s.area.push_back(cross.length());
    s.normal.push_back(cross / cross.length());
    s.centre.push_back(corners[2] == corners[3] ? (a + b + c) / 3.0 : (a + b + c + d) * 0.25);
}

/// Extruded surface through `points` (from the left side to the right side of the period), each
/// straight piece cut into equal segments no longer than max_length.
inline Surface polyline(const Domain& domain, const std::vector<Vec3>& points, double max_length) {
    Surface s;
    s.vertices.push_back(points.front());
    for (std::size_t p = 1; p < points.size(); ++p) {
        const Vec3 from = points[p - 1], to = points[p];
        const int pieces =
            std::max(1, static_cast<int>(std::ceil((to - from).length() / max_length - 1e-9)));
        for (int i = 1; i <= pieces; ++i) {
            s.vertices.push_back(i == pieces ? to : from + (to - from) * (double(i) / pieces));
            const int last = static_cast<int>(s.vertices.size()) - 1;
            add_element(s, {last - 1, last, -1, -1});
        }
    }
    const int n = static_cast<int>(s.size());
    const bool periodic = domain.sides == geometry::Sides::periodic;
    for (int e = 0; e < n; ++e) {
        s.next.push_back(e + 1 < n ? e + 1 : (periodic ? 0 : -1));
        s.previous.push_back(e > 0 ? e - 1 : (periodic ? n - 1 : -1));
    }
    return s;
}

/// Vertical trench of the given width and depth in the middle of the period, top at z = 0.
inline Surface trench(const Domain& domain, double width, double depth, double max_length) {
    const double side = 0.5 * domain.width_x(), w = 0.5 * width;
    return polyline(
        domain,
        {{-side, 0, 0}, {-w, 0, 0}, {-w, 0, -depth}, {w, 0, -depth}, {w, 0, 0}, {side, 0, 0}},
        max_length);
}

/// Surface of revolution about the z axis with radius(r) profile points from the rim (z = 0) down
/// to the axis, `around` quads per turn, open square of flat top around it (full symmetry).
/// profile: {r, z} pairs, first at z = 0, last at r = 0.
inline Surface revolved_hole(const Domain& domain,
                             const std::vector<std::array<double, 2>>& profile, int around) {
    Surface s;
    const double pi = 3.14159265358979323846, half = 0.5 * domain.width_x();
    const auto ring = [&](double r, double z, bool square) {
        const int first = static_cast<int>(s.vertices.size());
        for (int i = 0; i < around; ++i) {
            const double a = 2 * pi * (i + 0.5) / around - pi / around;
            double x = std::cos(a), y = std::sin(a);
            const double scale = square ? half / std::max(std::fabs(x), std::fabs(y)) : r;
            s.vertices.push_back(Vec3(x * scale, y * scale, z));
        }
        return first;
    };
    const auto join = [&](int outer, int inner) { // inner lies further along the profile
        for (int i = 0; i < around; ++i) {
            const int j = (i + 1) % around;
            add_element(s, {outer + i, outer + j, inner + j, inner + i});
        }
    };
    int last = ring(profile.front()[0], profile.front()[1], false);
    join(ring(half, 0, true), last);
    for (std::size_t p = 1; p + 1 < profile.size(); ++p) {
        const int next = ring(profile[p][0], profile[p][1], false);
        join(last, next);
        last = next;
    }
    const int centre = static_cast<int>(s.vertices.size());
    s.vertices.push_back(Vec3(0, 0, profile.back()[1]));
    for (int i = 0; i < around; ++i)
        add_element(s, {last + i, last + (i + 1) % around, centre, centre});
    return s;
}

} // namespace rille::tests
