// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"

namespace rille::geometry {

namespace {
constexpr double pi = 3.14159265358979323846;
} // namespace

Surface extract_surface(const Band& band) {
    return band.domain.planar_contour() ? extract_contour(band) : extract_full(band);
}

void add_element(Surface& s, const std::array<int, 4>& corners, int chain, bool revolved) {
    const Vec3 a = s.vertices[corners[0]], b = s.vertices[corners[1]];
    Vec3 centre, across;
    if (corners[2] < 0) {
        centre = (a + b) * 0.5;
        across = Vec3(a.z - b.z, 0, b.x - a.x);
    } else {
        const Vec3 c = s.vertices[corners[2]], d = s.vertices[corners[3]];
        centre = corners[2] == corners[3] ? (a + b + c) / 3.0 : (a + b + c + d) * 0.25;
        across = (c - a).cross(d - b) * 0.5;
    }
    const double size = across.length();
    s.corners.push_back(corners);
    s.centre.push_back(centre);
    s.area.push_back(revolved ? pi * (a.x + b.x) * size : size);
    s.normal.push_back(size > 0 ? across / size : Vec3(0, 0, 1));
    s.chain.push_back(chain);
}

} // namespace rille::geometry
