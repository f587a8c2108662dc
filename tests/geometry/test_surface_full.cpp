// SPDX-License-Identifier: Apache-2.0
#include "geometry/closest_element.hpp"
#include "geometry/extract_surface.hpp"
#include "tests/support/check_surface.hpp"
#include "tests/support/make_band.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::geometry;
using namespace rille::tests;

namespace {

Domain full(int nx, int ny, double h, Sides sides = Sides::mirror) {
    Domain d;
    d.symmetry = Symmetry::full;
    d.sides = sides;
    d.spacing = h;
    d.cells_x = nx;
    d.cells_y = ny;
    return d;
}

double box(const Vec3& p, const Vec3& half) { // exact distance to a box round the origin
    const Vec3 q(std::fabs(p.x) - half.x, std::fabs(p.y) - half.y, std::fabs(p.z) - half.z);
    const Vec3 out(std::max(q.x, 0.0), std::max(q.y, 0.0), std::max(q.z, 0.0));
    return out.length() + std::min(0.0, std::max({q.x, q.y, q.z}));
}

} // namespace

TEST_CASE("full planes are contoured to round-off", "[surface]") {
    // Oracle: the plane itself. Source: derived here. Tolerance: round-off of the coordinates.
    for (const double tilt : {0.0, 0.2, 0.7, 1.1})
        for (const double turned : {0.0, 0.6, 2.2}) {
            const Domain d = full(14, 11, 2.0);
            const Vec3 n(std::sin(tilt) * std::cos(turned), std::sin(tilt) * std::sin(turned),
                         std::cos(tilt));
            const auto plane = [&](const Vec3& p) { return n.dot(p - Vec3(0, 0, 1.23)); };
            const Surface s = extract_surface(make_band(d, plane, -60, 60));
            CAPTURE(tilt, turned);
            CHECK(largest_distance(s, plane) < 1e-12 * 60);
            for (std::size_t e = 0; e < s.size(); ++e)
                if (s.area[e] > 1e-6) CHECK((s.normal[e] - n).length() < 1e-9);
            CHECK(projected_area_fault(s, d) < 1e-9);
            CHECK(loose_edges(s, d) == 0);
        }
}

TEST_CASE("spheres converge at second order", "[surface]") {
    // Oracle: sphere, position and area. Source: derived here. Tolerance: observed order >= 1.8.
    double last_position = 0, last_area = 0;
    for (const int cells : {24, 48, 96}) {
        const Domain d = full(cells, cells, 24.0 / cells, Sides::periodic);
        const double radius = 8.3;
        const auto sphere = [&](const Vec3& p) {
            return (p - Vec3(0.4, -0.3, 0.2)).length() - radius;
        };
        const Surface s = extract_surface(make_band(d, sphere, -9, 9));
        double position = largest_distance(s, sphere);
        for (const Vec3& p : s.centre)
            position = std::max(position, std::fabs(sphere(p)));
        const double area = std::fabs(total_area(s) - 4 * M_PI * radius * radius);
        CHECK(loose_edges(s, d) == 0);
        for (std::size_t e = 0; e < s.size(); ++e)
            CHECK(s.normal[e].dot(s.centre[e] - Vec3(0.4, -0.3, 0.2)) > 0.8 * radius);
        CAPTURE(cells, position / d.spacing, area);
        if (last_area > 0) {
            CHECK(std::log2(last_position / position) > 1.8);
            CHECK(std::log2(last_area / area) > 1.8);
        }
        last_position = position;
        last_area = area;
    }
}

TEST_CASE("cubes and vias keep their edges and corners", "[surface]") {
    // Oracle: a box, solid and as a pit; its corners and area. Source: derived here.
    // Tolerance: corner 0.05 cell, every vertex 0.05 cell, area 0.5 %.
    for (const bool pit : {false, true})
        for (const double shift : {0.0, 0.21, 0.5, 0.77}) {
            const Domain d = full(32, 32, 1.0);
            const Vec3 half(7.3, 6.1, 5.4), at(shift, -0.6 * shift, 0.3 * shift);
            const auto shape = [&](const Vec3& p) { return (pit ? -1 : 1) * box(p - at, half); };
            const Surface s = extract_surface(make_band(d, shape, -8, 8));
            CAPTURE(pit, shift);
            CHECK(loose_edges(s, d) == 0);
            for (int m = 0; m < 8; ++m) {
                const Vec3 corner = at + Vec3(m & 1 ? half.x : -half.x, m & 2 ? half.y : -half.y,
                                              m & 4 ? half.z : -half.z);
                double nearest = 1e9;
                for (const Vec3& p : s.vertices)
                    nearest = std::min(nearest, (p - corner).length());
                CHECK(nearest < 0.05);
            }
            CHECK(largest_distance(s, shape) < 0.05);
            const double area = 8 * (half.x * half.y + half.y * half.z + half.z * half.x);
            CHECK(total_area(s) == Approx(area).epsilon(0.005));
        }
}

TEST_CASE("edges of narrow round holes are sharp", "[surface]") {
    // Oracle: a round hole through a plate: foot and rim are circles of its radius.
    // Source: derived here. Tolerance: 0.06 cell, every vertex and points on both circles; the same
    // hole 0.2 cell wider must fail.
    const double depth = 8;
    for (const double radius : {5.0, 8.0})
        for (const double shift : {0.0, 0.3}) {
            const int cells = 2 * static_cast<int>(radius + 7);
            const Domain d = full(cells, cells, 1.0, Sides::periodic);
            const Vec3 at(shift, 0.6 * shift, shift);
            const auto hole = [&](const Vec3& p, double r) {
                const double in = r - std::hypot(p.x - at.x, p.y - at.y), z = p.z - at.z;
                if (z > depth) return in < 0 ? z - depth : std::hypot(in, z - depth);
                if (in >= 0 && z >= 0) return std::min(in, z);
                if (in < 0 && z >= 0) return -std::min(-in, depth - z);
                return -std::min(in > 0 ? -z : std::hypot(in, z), depth - z);
            };
            const Surface s = extract_surface(make_band(
                d, [&](const Vec3& p) { return hole(p, radius); }, 0, depth + 1));
            CAPTURE(radius, shift);
            CHECK(loose_edges(s, d) == 0);
            CHECK(largest_distance(s, [&](const Vec3& p) { return hole(p, radius); }) < 0.06);
            CHECK(largest_distance(s, [&](const Vec3& p) { return hole(p, radius + 0.2); }) > 0.06);
            double farthest = 0;
            for (int a = 0; a < 100; ++a)
                for (const double z : {0.0, depth}) {
                    const double turn = 2 * M_PI * a / 100;
                    const Vec3 p = at + Vec3(radius * std::cos(turn), radius * std::sin(turn), z);
                    double nearest = 1e9;
                    for (std::size_t e = 0; e < s.size(); ++e)
                        if ((s.centre[e] - p).length2() < 6)
                            nearest = std::min(
                                nearest, (exact_nearest_point(s, false, static_cast<int>(e), p) - p)
                                             .length());
                    farthest = std::max(farthest, nearest);
                }
            CHECK(farthest < 0.06);
        }
}

TEST_CASE("round surfaces get no edges", "[surface]") {
    // Oracle: balls and ball-shaped voids of a few cells. Source: derived here.
    // Tolerance: 0.15 cell (an edge put where there is none stands off by up to a cell).
    for (const double radius : {2.5, 3.0, 4.0, 6.0})
        for (const double sign : {1.0, -1.0})
            for (const double shift : {0.0, 0.3}) {
                const Domain d = full(20, 20, 1.0, Sides::periodic);
                const auto ball = [&](const Vec3& p) {
                    return sign * ((p - Vec3(shift, 0.7 * shift, 0.2 * shift)).length() - radius);
                };
                CAPTURE(radius, sign, shift);
                CHECK(largest_distance(extract_surface(make_band(d, ball, -radius, radius)), ball) <
                      0.15);
            }
}

TEST_CASE("parts of round surfaces between mirrors get no edges", "[surface]") {
    // Oracle: half and quarter balls and voids about a side and about where two sides meet.
    // Source: derived here. Tolerance: 0.12 cell; faces fitted from within the period alone put
    // edges that stand off by up to 0.2 cells.
    const Domain d = full(16, 16, 1.0);
    for (const double radius : {2.5, 3.0, 3.1, 4.0, 6.0})
        for (const double sign : {1.0, -1.0})
            for (const double shift : {0.0, 0.3, 0.5})
                for (const Vec3& centre : {Vec3(-8, -8, shift), Vec3(8, shift, 0.2)}) {
                    const auto ball = [&](const Vec3& p) {
                        return sign * ((p - centre).length() - radius);
                    };
                    CAPTURE(radius, sign, shift, centre.x);
                    const Surface s = extract_surface(make_band(d, ball, -radius, radius + 1));
                    CHECK(largest_distance(s, ball) < 0.12);
                }
}

TEST_CASE("full surfaces cover one period whatever the sides", "[surface]") {
    // Oracle: projected area of the period; a closed rim. Source: derived here. Tolerance: 1e-9.
    for (const Sides sides : {Sides::mirror, Sides::periodic})
        for (int seed = 0; seed < 12; ++seed) {
            const Domain d = full(48, 40, 0.5, sides);
            const bool mirror = sides == Sides::mirror;
            const double a = 2.0 + 0.2 * seed, b = 0.9 * std::sin(seed), c = 0.4 * seed;
            const double kx = (mirror ? M_PI : 2 * M_PI) / d.width_x(),
                         ky = (mirror ? M_PI : 2 * M_PI) / d.width_y();
            const auto shape = [&](const Vec3& p) {
                const double lean = mirror ? 0 : 0.5 * std::sin(0.5 * p.z);
                const double u = kx * (p.x - d.x_min()) + (mirror ? 0 : c) + lean;
                const double v = ky * (p.y - d.y_min()) + (mirror ? 0 : 2 * c) - lean;
                return 0.5 * (p.z - a * std::cos(u) * std::cos(v) - b * std::cos(2 * u) -
                              0.5 * std::cos(2 * v));
            };
            const Surface s = extract_surface(make_band(d, shape, -6, 6, 8));
            CAPTURE(seed, static_cast<int>(sides), s.size());
            CHECK(loose_edges(s, d) == 0);
            double sum = 0;
            for (std::size_t e = 0; e < s.size(); ++e)
                if (s.chain[e] == 0) sum += s.area[e] * s.normal[e].z;
            CHECK(std::fabs(sum / (d.width_x() * d.width_y()) - 1) < 1e-9);
            double wrong = 0;
            int outside = 0;
            for (std::size_t e = 0; e < s.size(); ++e)
                if (s.area[e] > 1e-3 &&
                    shape(s.centre[e] + s.normal[e] * 0.2) < shape(s.centre[e] - s.normal[e] * 0.2))
                    wrong += s.area[e];
            for (const Vec3& p : s.vertices)
                if (std::fabs(p.x) > 0.5 * d.width_x() || std::fabs(p.y) > 0.5 * d.width_y())
                    ++outside;
            // Slivers where the surface folds within a cell may point the wrong way.
            CHECK(wrong < 2e-3 * total_area(s));
            CHECK(outside == 0);
        }
}

TEST_CASE("a round via keeps its rim", "[surface]") {
    // Oracle: circle of the via's rim and foot. Source: derived here.
    // Tolerance: 0.05 cell for every vertex; some vertex within 0.05 cell of the rim all round.
    for (const double radius : {10.0, 20.0}) {
        const Domain d = full(static_cast<int>(3 * radius), static_cast<int>(3 * radius), 1.0);
        const double depth = 12.4;
        const auto via = [&](const Vec3& q) {
            const double r = std::hypot(q.x - 0.3, q.y + 0.2) - radius, z = q.z - 0.2;
            if (z >= 0) return r >= 0 ? z : std::hypot(r, z);
            if (r < 0 && z > -depth) return std::min(-r, z + depth);
            if (r >= 0) return -std::min(-z, z > -depth ? r : std::hypot(r, z + depth));
            return z + depth;
        };
        const Surface s = extract_surface(make_band(d, via, -depth, 1));
        CHECK(loose_edges(s, d) == 0);
        CHECK(largest_distance(s, via) < (radius < 15 ? 0.07 : 0.05));
        std::vector<int> seen(36, 0);
        for (const Vec3& p : s.vertices) {
            const double x = p.x - 0.3, y = p.y + 0.2;
            if (std::hypot(std::hypot(x, y) - radius, p.z - 0.2) < 0.06)
                seen[static_cast<int>((std::atan2(y, x) + M_PI) / (2 * M_PI) * 35.999)] = 1;
        }
        CHECK(std::count(seen.begin(), seen.end(), 1) == 36);
    }
}
