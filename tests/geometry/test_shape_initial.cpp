// SPDX-License-Identifier: Apache-2.0
#include "geometry/initial_shape.hpp"
#include "geometry/opening_outlines.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <random>

using namespace rille::geometry;

namespace {

Domain domain(Symmetry symmetry, Sides sides, int nx, int ny, double h) {
    Domain d;
    d.symmetry = symmetry;
    d.sides = sides;
    d.spacing = h;
    d.cells_x = nx;
    d.cells_y = ny;
    return d;
}

/// Points of the rounded, tilted cross-section of a mask edge at u = 0, and whether it is solid.
struct Edge {
    double thickness, angle, radius;
    bool solid(double u, double z) const {
        if (z <= 0) return true;
        if (z > thickness) return false;
        const double c = std::cos(angle), s = std::sin(angle);
        if (u < z * c / s) return false;
        if (radius == 0) return true;
        const double cu = (radius + c * (thickness - radius)) / s, cz = thickness - radius;
        const double along_wall = (u - cu) * c + (z - cz) * s;
        if (along_wall <= 0 || u >= cu) return true;
        return std::hypot(u - cu, z - cz) <= radius;
    }
};

/// Distance by brute force: the nearest of fine samples that is on the other side.
double brute(const std::function<bool(const Vec3&)>& solid, const Vec3& p, double reach,
             double step) {
    const bool here = solid(p);
    double best = 1e9;
    for (double x = -reach; x <= reach; x += step)
        for (double z = -reach; z <= reach; z += step)
            if (solid(p + Vec3(x, 0, z)) != here) best = std::min(best, std::hypot(x, z));
    return here ? -best : best;
}

} // namespace

TEST_CASE("mask edges of any angle and rounding against brute force", "[shape]") {
    // Oracle: nearest sample of the other phase on a fine lattice. Source: derived here.
    // Tolerance: lattice step 0.05, one diagonal.
    const Domain d = domain(Symmetry::extruded, Sides::mirror, 60, 1, 1.0);
    std::mt19937 random(7);
    std::uniform_real_distribution<double> x(-12, 12), z(-4, 14);
    for (const double angle : {60.0, 88.0, 90.0, 92.0, 110.0})
        for (const double radius : {0.0, 2.5}) {
            MaskShape mask;
            mask.thickness = 8;
            mask.sidewall_angle_deg = angle;
            mask.corner_radius = radius;
            mask.openings = {{"t", Opening::Shape::trench, 14, 0, 1.5, 0}};
            const auto phi = initial_distance(d, mask);
            const Edge edge{8, angle * M_PI / 180, radius};
            const auto solid = [&](const Vec3& p) {
                return edge.solid(std::fabs(p.x - 1.5) - 7, p.z);
            };
            for (int n = 0; n < 40; ++n) {
                const Vec3 p(x(random), 0, z(random));
                const double exact = phi(p);
                CAPTURE(angle, radius, p);
                if (std::fabs(exact) > 4) continue;
                CHECK(solid(p) == (exact < 0));
                CHECK(exact == Approx(brute(solid, p, std::fabs(exact) + 0.3, 0.05)).margin(0.075));
            }
        }
}

TEST_CASE("mask distances in closed form", "[shape]") {
    // Oracle: distances to planes, edges and arcs. Source: derived here. Tolerance: round-off.
    const Domain d = domain(Symmetry::extruded, Sides::mirror, 100, 1, 1.0);
    MaskShape mask;
    mask.thickness = 10;
    mask.openings = {{"t", Opening::Shape::trench, 20, 0, 0, 0}};
    auto phi = initial_distance(d, mask);
    CHECK(phi({0, 0, 3}) == Approx(3));
    CHECK(phi({8, 0, 5}) == Approx(2));
    CHECK(phi({12, 0, 5}) == Approx(-2));
    CHECK(phi({7, 0, 14}) == Approx(5));
    CHECK(phi({13, 0, -4}) == Approx(-5));
    CHECK(phi({30, 0, 12}) == Approx(2));
    CHECK(phi({0, 0, -7}) == Approx(-7));
    // liner of 2: everything 2 further out
    CHECK(initial_distance(d, mask, 2)({8, 0, 5}) == Approx(0).margin(1e-12));
    CHECK(initial_distance(d, mask, 2)({7, 0, 14}) == Approx(3));
    // wall at 88 deg: distance along the wall's normal
    mask.sidewall_angle_deg = 88;
    phi = initial_distance(d, mask);
    const double a = 88 * M_PI / 180;
    CHECK(phi({9, 0, 5}) == Approx((1 + 5 / std::tan(a)) * std::sin(a)));
    mask.sidewall_angle_deg = 92;
    phi = initial_distance(d, mask);
    CHECK(phi({9, 0, 5}) == Approx((1 - 5 / std::tan(a)) * std::sin(a)));
    // rounded corner
    mask.sidewall_angle_deg = 90;
    mask.corner_radius = 4;
    phi = initial_distance(d, mask);
    CHECK(phi({11, 0, 11}) == Approx(std::hypot(3, 5) - 4));
    CHECK(phi({13, 0, 9}) == Approx(std::hypot(1, 3) - 4));
    // no mask, no openings
    CHECK(initial_distance(d, MaskShape{})({3, 0, -2}) == -2);
    mask.openings.clear();
    CHECK(initial_distance(d, mask)({3, 0, 12}) == Approx(2));
}

TEST_CASE("openings anywhere in the period", "[shape]") {
    // Oracle: the same opening placed in the middle. Source: derived here. Tolerance: round-off.
    MaskShape mask;
    mask.thickness = 10;
    const Domain periodic = domain(Symmetry::full, Sides::periodic, 40, 30, 1.0);
    mask.openings = {{"v", Opening::Shape::elliptic, 12, 8, 0, 0}};
    const auto centred = initial_distance(periodic, mask);
    mask.openings[0].centre_x = 18;
    mask.openings[0].centre_y = -14;
    const auto shifted = initial_distance(periodic, mask);
    std::mt19937 random(3);
    std::uniform_real_distribution<double> u(0, 1);
    for (int n = 0; n < 2000; ++n) {
        const Vec3 p(40 * u(random) - 20, 30 * u(random) - 15, 14 * u(random) - 2);
        CHECK(shifted(p + Vec3(18, -14, 0)) == Approx(centred(p)).margin(1e-11));
    }
    // mirror: a trench over the side is as wide as its two halves; the images beyond the side agree
    const Domain mirror = domain(Symmetry::extruded, Sides::mirror, 40, 1, 1.0);
    mask.openings = {{"t", Opening::Shape::trench, 12, 0, 19, 0}};
    const auto phi = initial_distance(mirror, mask);
    CHECK(phi({20, 0, 5}) == Approx(5));
    CHECK(phi({20, 0, 9}) == Approx(std::min(9.0, 7.0)));
    CHECK(phi({12.5, 0, 5}) == Approx(-0.5));
    CHECK(phi({27.5, 0, 5}) == Approx(-0.5)); // image of 12.5
    CHECK(phi({-19, 0, 12}) == Approx(2));
    // several openings: the nearest wall
    mask.openings = {{"a", Opening::Shape::trench, 6, 0, -10, 0},
                     {"b", Opening::Shape::trench, 8, 0, 6, 0}};
    CHECK(initial_distance(mirror, mask)({0.5, 0, 5}) == Approx(-1.5));
    CHECK(initial_distance(mirror, mask)({-5, 0, 5}) == Approx(-2));
}

TEST_CASE("distance to an ellipse", "[shape]") {
    // Oracle: minimum over a fine parameter. Source: derived here. Tolerance: 1e-6 of the width.
    std::mt19937 random(11);
    std::uniform_real_distribution<double> u(0, 1.6);
    for (const double b : {1.0, 0.999, 0.6, 0.2})
        for (int n = 0; n < 60; ++n) {
            const double x = n % 10 == 0 ? 0 : u(random), y = n % 10 == 1 ? 0 : u(random);
            double best = 1e9;
            double from = 0, to = M_PI / 2;
            for (int level = 0; level < 6; ++level) {
                double at = from;
                for (int m = 0; m <= 400; ++m) {
                    const double t = from + (to - from) * m / 400;
                    const double r = std::hypot(x - std::cos(t), y - b * std::sin(t));
                    if (r < best) {
                        best = r;
                        at = t;
                    }
                }
                const double width = (to - from) / 100;
                from = at - width;
                to = at + width;
            }
            CAPTURE(b, x, y);
            CHECK(std::fabs(ellipse_distance(x, y, 1, b)) == Approx(best).margin(2e-8));
            CHECK(ellipse_distance(y, x, b, 1) == ellipse_distance(x, y, 1, b));
            CHECK((ellipse_distance(x, y, 1, b) < 0) == (x * x + y * y / b / b < 1));
        }
}
