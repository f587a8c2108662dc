// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"
#include "tests/support/check_surface.hpp"
#include "tests/support/make_band.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::geometry;
using namespace rille::tests;

namespace {

Domain extruded(int cells, double h, Sides sides = Sides::mirror) {
    Domain d;
    d.sides = sides;
    d.spacing = h;
    d.cells_x = cells;
    return d;
}

} // namespace

TEST_CASE("extruded planes are contoured to round-off", "[surface]") {
    // Oracle: the plane itself. Source: derived here. Tolerance: round-off of the coordinates.
    for (const double tilt : {0.0, 0.1, 0.3, 0.7, 1.1, -0.4}) {
        const Domain d = extruded(30, 2.0);
        const Vec3 n(std::sin(tilt), 0, std::cos(tilt));
        const auto plane = [&](const Vec3& p) { return n.dot(p - Vec3(0, 0, 1.23)); };
        const double rise = 30 * std::fabs(std::tan(tilt));
        const Surface s = extract_surface(make_band(d, plane, -rise, 2 + rise));
        CAPTURE(tilt);
        CHECK(largest_distance(s, plane) < 1e-12 * 60);
        for (const Vec3& m : s.normal) CHECK((m - n).length() < 1e-11);
        CHECK(projected_area_fault(s, d) < 1e-12);
        CHECK(consistent_chains(s, d));
        for (double a : s.area) CHECK(a > 0.15 * d.spacing * (1 - 1e-9));
    }
}

TEST_CASE("extruded lip keeps its corners", "[surface]") {
    for (const int width : {20, 40, 80})
        for (const double shift : {0.0, 0.17, 0.5, 0.83}) {
            const Domain d = extruded(2 * width, 1.0);
            const double w = 0.5 * width, depth = width;
            // exact distance to the trench: the union of a plane and two blocks
            const auto trench = [&](const Vec3& q) {
                const Vec3 p = q - Vec3(shift, 0, 0.37 * shift);
                const double in = w - std::fabs(p.x); // > 0 inside the opening
                if (p.z >= 0) return in <= 0 ? p.z : std::hypot(in, p.z);
                if (in <= 0) { // solid beside the opening, or below it
                    const double up = -p.z, wall = -in;
                    if (p.z < -depth) return -std::min(up, std::hypot(wall, p.z + depth));
                    return -std::min(up, wall);
                }
                if (p.z >= -depth) {
                    const double rim = p.z > -depth ? in : 0;
                    return std::min(rim, p.z + depth);
                }
                return p.z + depth;
            };
            const Surface s = extract_surface(make_band(d, trench, -depth - 2, 2));
            CAPTURE(width, shift);
            CHECK(consistent_chains(s, d));
            CHECK(projected_area_fault(s, d) < 1e-12);
            for (const double side : {-1.0, 1.0})
                for (const double z : {0.0, -depth}) {
                    double nearest = 1e9;
                    const Vec3 corner(side * w + shift, 0, z + 0.37 * shift);
                    for (const Vec3& p : s.vertices) nearest = std::min(nearest, (p - corner).length());
                    CHECK(nearest < 0.05);
                }
            double worst = 0;
            for (std::size_t e = 0; e < s.size(); ++e) worst = std::max(worst, std::fabs(trench(s.centre[e])));
            CHECK(worst < 1e-9);
        }
}
