// SPDX-License-Identifier: Apache-2.0
#include "tests/geometry/etch_loop.hpp"

#include <catch2/catch.hpp>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

/// Distance to the square |x|, |z - z0| <= half, > 0 outside.
double square_distance(const Vec3& p, double z0, double half) {
    const double x = std::fabs(p.x) - half, z = std::fabs(p.z - z0) - half;
    if (x > 0 && z > 0) return std::hypot(x, z);
    return std::max(x, z);
}

double circle_error(int cells, double sign) {
    // Circle of radius 10 in a period of 40 grows or shrinks by 4.
    const double h = 40.0 / cells, r0 = 10;
    const Domain d = make_domain(Symmetry::extruded, Sides::periodic, h, cells);
    Front front(
        d, [&](const Vec3& p) { return std::hypot(p.x, p.z) - r0; }, -r0, r0);
    Loop loop;
    loop.law = [&](const Surface&, int, int, double) { return sign; };
    etch(front, loop, 3);
    double sum = 0;
    const Surface s = extract_surface(front);
    for (const Vec3& v : s.vertices)
        sum += std::fabs(std::hypot(v.x, v.z) - (r0 - 3 * sign));
    return sum / s.vertices.size();
}

} // namespace

TEST_CASE("aligned planes move exactly", "[advance]") {
    // Oracle: depth = rate times time. Source: derived here. Tolerance: round-off of 100 cells.
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        const Domain d = make_domain(Symmetry::extruded, sides, 2.0, 12);
        Front front(
            d, [](const Vec3& p) { return p.z - 0.3; }, 0.3, 0.3);
        Loop loop;
        loop.law = [](const Surface&, int, int, double) { return 0.7; };
        etch(front, loop, 100);
        const Surface s = extract_surface(front);
        REQUIRE(s.size() > 0);
        CHECK(worst_vertex(s, [](const Vec3& p) { return p.z + 69.7; }) < 1e-11);
        // should fail with a rate that is 2 % off
        CHECK(worst_vertex(s, [](const Vec3& p) { return p.z + 69.7 * 1.02; }) > 1);
    }
}

TEST_CASE("oblique walls move exactly away from kinks", "[advance]") {
    // A zigzag of slope 0.5 whose flanks recede: flanks stay planes.
    // Oracle: flanks move by rate * time along their normals. Source: derived here.
    // Tolerance: 1e-6 cells, second order would be exact for planes.
    const Domain d = make_domain(Symmetry::extruded, Sides::mirror, 1.0, 60);
    const double c = std::cos(std::atan(0.5));
    Front front(
        d, [&](const Vec3& p) { return (p.z - 0.5 * std::fabs(p.x)) * c; }, 0, 15);
    etch(front, Loop(), 10);
    const Surface s = extract_surface(front);
    double worst = 0;
    for (const Vec3& v : s.vertices)
        if (std::fabs(v.x) > 12 && std::fabs(v.x) < 24)
            worst = std::max(worst, std::fabs((v.z - 0.5 * std::fabs(v.x)) * c + 10));
    CAPTURE(worst);
    CHECK(worst < 1e-6);
}

TEST_CASE("circles keep second order", "[advance]") {
    // Oracle: radius changes by rate * time. Source: derived here. Tolerance: order >= 1.8 from 20
    // cells of radius on (at 10 two errors of opposite sign nearly cancel); 0.004 cell at 10.
    for (const double sign : {1.0, -1.0}) {
        const double a = circle_error(80, sign), b = circle_error(160, sign),
                     c = circle_error(320, sign);
        CAPTURE(sign, a, b, c);
        CHECK(std::log2(a / b) >= 1.8);
        CHECK(std::log2(b / c) >= 1.8);
        CHECK(circle_error(40, sign) < 0.004);
    }
}

TEST_CASE("squares shrink with sharp corners", "[advance]") {
    // Oracle: area (s - 2t)^2. Source: derived here (offsets of convex bodies).
    // Tolerance: a quarter of a cell times the perimeter / 8.
    const Domain d = make_domain(Symmetry::extruded, Sides::periodic, 1.0, 80);
    Front front(
        d, [&](const Vec3& p) { return square_distance(p, 0.2, 25.3); }, -25.1, 25.5);
    etch(front, Loop(), 8);
    const Surface s = extract_surface(front);
    const double area = -area_below(s), exact = std::pow(2 * 17.3, 2);
    CAPTURE(area, exact);
    CHECK(std::fabs(area - exact) < 1);
    CHECK(worst_vertex(s, [](const Vec3& p) { return square_distance(p, 0.2, 17.3); }) < 0.05);
}

TEST_CASE("squares grow with round corners", "[advance]") {
    // Oracle: area s^2 + 4 s t + pi t^2. Source: derived here (offsets of convex bodies).
    // Tolerance: 0.25 cell on the rounded corners; 0.05 cell over the perimeter.
    const Domain d = make_domain(Symmetry::extruded, Sides::periodic, 1.0, 80);
    Front front(
        d, [&](const Vec3& p) { return square_distance(p, 0.2, 15.3); }, -15.1, 15.5);
    Loop loop;
    loop.law = [](const Surface&, int, int, double) { return -1.0; };
    etch(front, loop, 8);
    const Surface s = extract_surface(front);
    const double area = -area_below(s), exact = 30.6 * 30.6 + 4 * 30.6 * 8 + pi * 64;
    const double corner =
        worst_vertex(s, [](const Vec3& p) { return square_distance(p, 0.2, 15.3) - 8; });
    CAPTURE(area, exact, corner);
    CHECK(std::fabs(area - exact) < 0.05 * (4 * 30.6 + 2 * pi * 8));
    CHECK(corner < 0.25);
}
