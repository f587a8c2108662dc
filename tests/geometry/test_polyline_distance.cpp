// SPDX-License-Identifier: Apache-2.0
#include "geometry/front.hpp"
#include "geometry/initial_shape.hpp"
#include "geometry/polyline_distance.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::geometry;

namespace {

Domain cell(Sides sides = Sides::mirror) {
    Domain d;
    d.cells_x = 80;
    d.sides = sides;
    return d;
}

/// The outline of a mask with one slanted opening, as points.
Polyline mask_outline(double half, double thickness, double lean) {
    return {{-40, thickness}, {-half - lean, thickness}, {-half, 0},
            {half, 0},        {half + lean, thickness},  {40, thickness}};
}

double largest_difference(const Domain& d, const std::function<double(const Vec3&)>& a,
                          const std::function<double(const Vec3&)>& b, double z_low,
                          double z_high) {
    double worst = 0;
    const double reach = 5 * d.spacing;
    for (double x = -70; x <= 70; x += 0.37)
        for (double z = z_low; z <= z_high; z += 0.41)
            worst =
                std::max(worst, std::fabs(a({x, 0, z}) - std::clamp(b({x, 0, z}), -reach, reach)));
    return worst;
}

} // namespace

TEST_CASE("distance to a contour is that of the shape it outlines", "[polyline]") {
    // Oracle: the signed distance of the mask as drawn, mirrored and repeated beyond the sides.
    // Source: derived here.
    // Tolerance: 1e-9 nm within five cells; a contour half a nanometre off must show as such.
    MaskShape mask;
    mask.thickness = 30;
    mask.sidewall_angle_deg = 80;
    Opening opening;
    opening.width_x = 40;
    mask.openings = {opening};
    const double lean = 30 / std::tan(80 * 3.14159265358979323846 / 180);
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        const Domain d = cell(sides);
        const auto drawn = initial_distance(d, mask);
        const auto traced = polyline_distance(d, {mask_outline(20, 30, lean)}, 5 * d.spacing);
        CHECK(largest_difference(d, traced, drawn, -20, 50) < 1e-9);
        const auto off = polyline_distance(d, {mask_outline(20.5, 30, lean)}, 5 * d.spacing);
        CHECK(largest_difference(d, off, drawn, -20, 50) > 0.4);
    }
}

TEST_CASE("voids and overhangs of a contour have the right sign", "[polyline]") {
    // Oracle: points named by hand.
    // Source: derived here.
    // Tolerance: 1e-12 nm.
    const Domain d = cell();
    // A bottle, wider below than at its neck, with a void beside it.
    const Polyline bottle = {{-40, 0},  {-5, 0},   {-5, -10}, {-15, -20}, {-15, -30},
                             {15, -30}, {15, -20}, {5, -10},  {5, 0},     {40, 0}};
    const Polyline hole = {{25, -20}, {25, -24}, {30, -24}, {30, -20}, {25, -20}};
    const auto phi = polyline_distance(d, {bottle, hole}, 5);
    CHECK(phi({0, 0, -25}) == Approx(5).margin(1e-12));   // gas, held at the reach
    CHECK(phi({-12, 0, -25}) == Approx(3).margin(1e-12)); // gas below the overhang
    CHECK(phi({-12, 0, -8}) == Approx(-5).margin(1e-12)); // solid above it
    CHECK(phi({27.5, 0, -22}) == Approx(2).margin(1e-12));
    CHECK(phi({23, 0, -22}) == Approx(-2).margin(1e-12));
    CHECK(phi({0, 0, -100}) == Approx(-5).margin(1e-12));
    CHECK(phi({0, 0, 100}) == Approx(5).margin(1e-12));
    CHECK(phi({52.5, 0, -22}) == Approx(2).margin(1e-12)); // its mirror image
}

TEST_CASE("a front made from a contour lies on it", "[polyline]") {
    // Oracle: straight pieces of the contour, away from corners.
    // Source: derived here.
    // Tolerance: 1e-6 nm for the interpolated distance along straight pieces.
    const Domain d = cell();
    const Polyline line = {{-40, 3.3},    {-20.2, 3.3}, {-14.7, -31.6},
                           {14.7, -31.6}, {20.2, 3.3},  {40, 3.3}};
    const Front front(d, polyline_distance(d, {line}, 5), -36, 8);
    for (const double t : {0.3, 0.5, 0.7}) {
        CHECK(std::fabs(front.distance({-40 + t * 14, 0, 3.3})) < 1e-6);
        CHECK(std::fabs(front.distance({-20.2 + t * 5.5, 0, 3.3 - t * 34.9})) < 1e-6);
        CHECK(std::fabs(front.distance({-10 + t * 20, 0, -31.6})) < 1e-6);
    }
}

TEST_CASE("a contour that crosses itself is found", "[polyline]") {
    // Oracle: crossings placed by hand. Source: derived here. Tolerance: 1e-12 nm.
    CHECK_FALSE(find_crossing({mask_outline(20, 30, 5)}));
    const auto found = find_crossing({{{0, 0}, {10, 0}, {10, 10}, {5, 10}, {5, -10}}});
    REQUIRE(found);
    CHECK(found->piece == 0);
    CHECK(found->other_piece == 3);
    CHECK(found->x == Approx(5).margin(1e-12));
    CHECK(found->z == Approx(0).margin(1e-12));
    const auto other = find_crossing({{{0, 0}, {10, 0}}, {{20, 5}, {8, -5}, {8, 5}}});
    REQUIRE(other);
    CHECK(other->other_line == 1);
    CHECK(other->other_piece == 1); // the first piece passes beyond the end
    // Closed lines meet at their ends.
    CHECK_FALSE(find_crossing({{{0, 0}, {4, 0}, {4, 4}, {0, 0}}}));
}
