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

/// Direct cosine flux at the floor element under x: (sin left + sin right) / 2 of the horizons.
double floor_flux(const Surface& s, double x) {
    int at = 0;
    for (int e = 0; e < static_cast<int>(s.size()); ++e)
        if (std::fabs(s.centre[e].x - x) < std::fabs(s.centre[at].x - x)) at = e;
    const Vec3 p(x, 0, s.centre[at].z);
    double left = 1, right = 1;
    for (const Vec3& v : s.vertices) {
        const double dx = v.x - p.x, dz = v.z - p.z;
        if (dz < 0.5) continue;
        (dx < 0 ? left : right) =
            std::min(dx < 0 ? left : right, std::fabs(dx) / std::hypot(dx, dz));
    }
    return 0.5 * (left + right);
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
        for (const Vec3& m : s.normal)
            CHECK((m - n).length() < 1e-11);
        CHECK(projected_area_fault(s, d) < 1e-12);
        CHECK(consistent_chains(s, d));
        for (double a : s.area)
            CHECK(a > 0.15 * d.spacing * (1 - 1e-9));
    }
}

TEST_CASE("extruded lip keeps its corners", "[surface]") {
    // Oracle: the true corners; direct cosine flux at the floor's centre, (w/2) / sqrt(w^2/4 +
    // L^2). Source: derived here. Tolerance: corner 0.05 cell; flux 1.0, 0.5, 0.25 % at 20, 40, 80
    // cells.
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
                    for (const Vec3& p : s.vertices)
                        nearest = std::min(nearest, (p - corner).length());
                    CHECK(nearest < 0.05);
                }
            double worst = 0;
            for (std::size_t e = 0; e < s.size(); ++e)
                worst = std::max(worst, std::fabs(trench(s.centre[e])));
            CHECK(worst < 1e-9);
            CHECK(std::fabs(floor_flux(s, shift) / (w / std::hypot(w, depth)) - 1) <
                  (width == 20   ? 0.01
                   : width == 40 ? 0.005
                                 : 0.0025));
        }
}

TEST_CASE("extruded circles converge at second order", "[surface]") {
    // Oracle: circle, position and enclosed area. Source: derived here.
    // Tolerance: observed order >= 1.8 between successive grids, position and area.
    for (const bool void_inside : {true, false}) {
        double last_position = 0, last_area = 0;
        for (const int cells : {40, 80, 160}) {
            const Domain d = extruded(cells, 40.0 / cells, Sides::periodic);
            const double radius = 11.3;
            const auto circle = [&](const Vec3& p) {
                const double r = std::hypot(p.x - 2.1, p.z + 0.3) - radius;
                return void_inside ? -r : r;
            };
            const Surface s = extract_surface(make_band(d, circle, -12, 12));
            CHECK(consistent_chains(s, d));
            double area = 0, position = 0;
            for (std::size_t e = 0; e < s.size(); ++e) {
                const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
                area += 0.5 * (a.x * b.z - a.z * b.x);
                position = std::max(position, std::fabs(circle(s.centre[e])));
                CHECK(s.area[e] > 0.15 * d.spacing * (1 - 1e-9));
                CHECK((circle(s.centre[e] + s.normal[e] * 0.1) > circle(s.centre[e])));
            }
            position = std::max(position, largest_distance(s, circle));
            const double fault = std::fabs(std::fabs(area) - M_PI * radius * radius);
            CHECK((area > 0) == void_inside); // gas on the left
            if (last_position > 0) {
                CHECK(std::log2(last_position / position) > 1.8);
                CHECK(std::log2(last_area / fault) > 1.8);
            }
            last_position = position;
            last_area = fault;
        }
    }
}

TEST_CASE("extruded surfaces cover one period whatever the sides", "[surface]") {
    // Oracle: the projected width is the period's. Source: derived here. Tolerance: 1e-9.
    for (const Sides sides : {Sides::mirror, Sides::periodic})
        for (int seed = 0; seed < 40; ++seed) {
            const Domain d = extruded(48, 0.5, sides);
            const double step =
                sides == Sides::mirror ? M_PI / d.width_x() : 2 * M_PI / d.width_x();
            const double a = 2.0 + 0.05 * seed, b = 1.3 * std::sin(seed), phase = 0.37 * seed;
            // folded back over itself: overhangs cross the sides
            const auto shape = [&](const Vec3& p) {
                const double u = (p.x - d.x_min()) * step + (sides == Sides::periodic ? phase : 0);
                const double lean = sides == Sides::periodic ? 0.7 * std::sin(0.7 * p.z) : 0;
                const double f = p.z - a * std::cos(u + lean) - b * std::cos(2 * u);
                return 0.5 * f;
            };
            const Surface s = extract_surface(make_band(d, shape, -9, 9, 9));
            CAPTURE(seed, static_cast<int>(sides), s.size());
            CHECK(consistent_chains(s, d));
            double sum = 0;
            for (std::size_t e = 0; e < s.size(); ++e)
                if (s.chain[e] == 0) sum += s.area[e] * s.normal[e].z;
            CHECK(std::fabs(sum / d.width_x() - 1) < 1e-9);
            for (std::size_t e = 0; e < s.size(); ++e)
                CHECK(shape(s.centre[e] + s.normal[e] * 0.25) >
                      shape(s.centre[e] - s.normal[e] * 0.25));
        }
}

TEST_CASE("chain 0 is the open one, further chains are the rest", "[surface]") {
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        const Domain d = extruded(60, 1.0, sides);
        const auto shape = [&](const Vec3& p) { // void below, drop above, a drop on the left side
            const double hole = 6.0 - std::hypot(p.x - 8, p.z + 15);
            const double drop = std::hypot(p.x + 5, p.z - 12) - 5.0;
            const double edge =
                std::hypot(std::min(p.x + 30, 30 - p.x + (sides == Sides::mirror ? 99 : 0)),
                           p.z - 20) -
                4.0;
            return std::min({std::max(p.z, hole), drop, edge});
        };
        const Surface s = extract_surface(make_band(d, shape, -22, 26));
        CHECK(consistent_chains(s, d));
        CHECK(*std::max_element(s.chain.begin(), s.chain.end()) == 3);
        for (std::size_t e = 0; e < s.size(); ++e)
            CHECK((s.chain[e] == 0) == (std::fabs(s.centre[e].z) < 1e-9));
    }
}

TEST_CASE("wedges and pillars keep their tips", "[surface]") {
    // Oracle: two planes meeting at the origin. Source: derived here. Tolerance: 0.05 cell.
    for (const double half_angle : {20.0, 35.0, 45.0, 60.0, 70.0})
        for (const double lean : {0.0, 13.0, 31.0})
            for (const bool ridge : {true, false}) {
                const Domain d = extruded(40, 1.0);
                const double a = half_angle * M_PI / 180, b = lean * M_PI / 180;
                const Vec3 n1(std::cos(a - b), 0, std::sin(a - b)),
                    n2(-std::cos(a + b), 0, std::sin(a + b));
                const Vec3 tip(0.31, 0, 0.43);
                const auto wedge = [&](const Vec3& q) {
                    const Vec3 p = ridge ? q - tip : (q - tip) * -1.0;
                    // exact: outside beyond the tip's normal cone
                    const double d1 = n1.dot(p), d2 = n2.dot(p);
                    const Vec3 t1(-n1.z, 0, n1.x), t2(-n2.z, 0, n2.x);
                    double dist = std::max(d1, d2);
                    if (t1.dot(p) > 0 && t2.dot(p) < 0) dist = p.length();
                    return ridge ? dist : -dist;
                };
                const Surface s = extract_surface(make_band(d, wedge, -400, 400));
                double nearest = 1e9;
                for (const Vec3& p : s.vertices)
                    nearest = std::min(nearest, (p - tip).length());
                CAPTURE(half_angle, lean, ridge);
                CHECK(nearest < 0.05);
                CHECK(consistent_chains(s, d));
            }
}
