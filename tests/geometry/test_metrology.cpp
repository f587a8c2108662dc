// SPDX-License-Identifier: Apache-2.0
#include "geometry/metrology.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

// Oracle (all cases): polygons with corners at known places, read by hand.
// Source: derived here.
// Tolerance: 1e-9 nm and 1e-9 deg, round-off of coordinates of about 100 nm.

using namespace rille::geometry;
using namespace rille::tests;

namespace {

const double pi = 3.14159265358979323846;

Approx near(double v) {
    return Approx(v).margin(1e-9).epsilon(0);
}

Domain line_period(int cells, Sides sides = Sides::mirror) {
    Domain d;
    d.sides = sides;
    d.cells_x = cells;
    return d;
}

FeatureSite site_at(double x, double width) {
    FeatureSite s;
    s.centre_x = x;
    s.width_x = width;
    return s;
}

/// Change of a value when every element moves out by displacement(centre).
template <class Displacement>
double response(const Measured& m, const Surface& s, Displacement displacement) {
    double sum = 0;
    for (const auto& [element, weight] : m.elements)
        sum += weight * displacement(s.centre[element]);
    return sum;
}

/// A trench in a mask of 30 nm: right and left walls go through the given x at z = 0 and z =
/// -depth.
Surface trapezoid(const Domain& d, double mask, double left_top, double left_bottom,
                  double right_bottom, double right_top, double depth) {
    const double half = 0.5 * d.width_x();
    return polyline(d,
                    {{-half, 0, mask},
                     {left_top, 0, mask},
                     {left_top, 0, 0},
                     {left_bottom, 0, -depth},
                     {right_bottom, 0, -depth},
                     {right_top, 0, 0},
                     {right_top, 0, mask},
                     {half, 0, mask}},
                    1.0);
}

} // namespace

TEST_CASE("a straight trench", "[metrology]") {
    const Domain d = line_period(120);
    const Surface s = trench(d, 40, 80, 1.0);
    const FeatureSite site = site_at(0, 40);
    for (const double z : {-0.3, -17.77, -79.9}) {
        const auto cd = cd_at(d, s, site, z);
        REQUIRE(cd);
        CHECK(cd->value == near(40));
        // Both walls moving in by 1 nm close the trench by 2 nm.
        CHECK(response(*cd, s, [](const Vec3&) { return 1.0; }) == near(-2));
    }
    CHECK_FALSE(cd_at(d, s, site, 1));
    CHECK_FALSE(cd_at(d, s, site, -81));
    CHECK_FALSE(cd_y_at(d, s, site, -10));
    CHECK_FALSE(cd_area_at(d, s, site, -10));
    const auto angles = sidewall_angles(d, s, site, -72, -8);
    REQUIRE(angles);
    CHECK(angles->left.value == near(90));
    CHECK(angles->right.value == near(90));
    CHECK_FALSE(sidewall_angles(d, s, site, -90, -8));
    const auto floor = floor_of(d, s, site);
    REQUIRE(floor);
    for (const Measured* m :
         {&floor->centre, &floor->left_edge, &floor->right_edge, &floor->deepest}) {
        CHECK(m->value == near(-80));
        CHECK(response(*m, s, [](const Vec3&) { return 1.0; }) == near(1));
    }
    const auto bow = widest_cd(d, s, site, -80, 0);
    REQUIRE(bow);
    CHECK(bow->cd.value == near(40));
    CHECK(bow->z == near(0));
    const auto top = top_between(d, s, -60, -20, 0);
    REQUIRE(top);
    CHECK(top->value == near(0));
    CHECK_FALSE(mask_facet_angle(d, s, site, -40));
}

TEST_CASE("tapered and re-entrant walls", "[metrology]") {
    const Domain d = line_period(160);
    // Left 85 deg, right re-entrant 92 deg.
    const double depth = 100, in = depth / std::tan(85 * pi / 180),
                 out = depth * std::tan(2 * pi / 180);
    const Surface s = trapezoid(d, 30, -30, -30 + in, 30 + out, 30, depth);
    const FeatureSite site = site_at(0, 60);
    const auto cd = cd_at(d, s, site, -40.3);
    REQUIRE(cd);
    CHECK(cd->value == near(60 - 0.403 * in + 0.403 * out));
    const auto angles = sidewall_angles(d, s, site, -90, -10);
    REQUIRE(angles);
    CHECK(angles->left.value == near(85));
    CHECK(angles->right.value == near(92));
    const auto bow = widest_cd(d, s, site, -100, 0);
    REQUIRE(bow);
    CHECK(bow->cd.value == near(60)); // the left wall closes faster than the right one opens
    CHECK(bow->z == near(0));

    SECTION("a wall that moves as a whole moves the CD and keeps its angle") {
        const double shift = 0.25, across = shift / std::sin(85 * pi / 180);
        const Surface moved =
            trapezoid(d, 30, -30 + across, -30 + in + across, 30 + out, 30, depth);
        const auto on_left = [&](const Vec3& c) { return c.x < 0 ? shift : 0.0; };
        const double change = cd_at(d, moved, site, -40.3)->value - cd->value;
        CHECK(change == near(response(*cd, s, on_left)));
        CHECK(response(angles->left, s, on_left) == near(0));
    }
    SECTION("a wall that tilts changes its angle") {
        // The foot of the right wall moves in by 0.01 nm: the displacement grows with depth.
        const double step = 0.01;
        const Surface moved = trapezoid(d, 30, -30, -30 + in, 30 + out - step, 30, depth);
        const auto after = sidewall_angles(d, moved, site, -90, -10);
        const double tilt = std::cos(2 * pi / 180);
        const auto wall = [&](const Vec3& c) { return c.x > 0 ? -c.z / depth * step * tilt : 0; };
        const double change = after->right.value - angles->right.value;
        CHECK(change == Approx(-step / depth * 180 / pi).epsilon(0.01));
        // One displacement per element of 1 nm: its steps cost about (1 / 80)^2.
        CHECK(response(angles->right, s, wall) == Approx(change).epsilon(1e-3));
    }
}

TEST_CASE("a bowed trench", "[metrology]") {
    const Domain d = line_period(120);
    const Surface s = polyline(d,
                               {{-60, 0, 20},
                                {-20, 0, 20},
                                {-20, 0, 0},
                                {-26.25, 0, -31.5},
                                {-15, 0, -90},
                                {15, 0, -90},
                                {27.5, 0, -31.5},
                                {20, 0, 0},
                                {20, 0, 20},
                                {60, 0, 20}},
                               1.0);
    const FeatureSite site = site_at(0, 40);
    const auto bow = widest_cd(d, s, site, -90, 0);
    REQUIRE(bow);
    CHECK(bow->cd.value == near(53.75));
    CHECK(bow->z == near(-31.5));
    // At the kink either of the two pieces decides; their mean stands for both.
    const double up = std::hypot(6.25, 31.5) / 31.5, down = std::hypot(11.25, 58.5) / 58.5;
    const double right_up = std::hypot(7.5, 31.5) / 31.5,
                 right_down = std::hypot(12.5, 58.5) / 58.5;
    CHECK(response(bow->cd, s, [](const Vec3&) { return 1.0; }) ==
          near(-0.5 * (up + down + right_up + right_down)));
    const auto part = widest_cd(d, s, site, -90, -60.75); // below the widest place
    REQUIRE(part);
    CHECK(part->cd.value == near(0.5 * (30 + 53.75)));
    CHECK(part->z == near(-60.75));
    CHECK_FALSE(widest_cd(d, s, site, -200, -150));
}

TEST_CASE("a microtrenched and a slanted floor", "[metrology]") {
    const Domain d = line_period(120);
    const FeatureSite site = site_at(0, 40);
    const Surface s = polyline(d,
                               {{-60, 0, 0},
                                {-20, 0, 0},
                                {-20, 0, -86},
                                {-18.5, 0, -86.5},
                                {-14, 0, -80},
                                {14, 0, -80},
                                {17, 0, -83.25},
                                {20, 0, -81},
                                {20, 0, 0},
                                {60, 0, 0}},
                               1.0);
    const auto floor = floor_of(d, s, site);
    REQUIRE(floor);
    CHECK(floor->centre.value == near(-80));
    CHECK(floor->left_edge.value == near(-86.5));
    CHECK(floor->right_edge.value == near(-83.25));
    CHECK(floor->deepest.value == near(-86.5));

    const Surface slanted = polyline(
        d, {{-60, 0, 0}, {-20, 0, 0}, {-20, 0, -70}, {20, 0, -90}, {20, 0, 0}, {60, 0, 0}}, 1.0);
    const auto slope = floor_of(d, slanted, site);
    REQUIRE(slope);
    CHECK(slope->centre.value == near(-80));
    // Bottom CD at 90 % of 80 nm: 36 nm wide, as the floor itself rises above that on the left.
    CHECK(slope->left_edge.value == near(-72 - 0.5 * 3.6));
    CHECK(slope->right_edge.value == near(-90));
    CHECK(slope->deepest.value == near(-90));
    CHECK(response(slope->centre, slanted, [](const Vec3&) { return 1.0; }) ==
          near(std::sqrt(1.25)));
}

TEST_CASE("floors where there is no wall, no etch or no way in", "[metrology]") {
    const Domain d = line_period(100);
    const FeatureSite site = site_at(0, 40);
    const Surface blank = polyline(d, {{-50, 0, -3.25}, {50, 0, -3.25}}, 1.0);
    const auto flat = floor_of(d, blank, site);
    REQUIRE(flat);
    CHECK(flat->centre.value == near(-3.25));
    CHECK(flat->right_edge.value == near(-3.25));
    CHECK_FALSE(cd_at(d, blank, site, -1));

    // Closed at the mask, a void below: chain 1.
    Surface closed = polyline(d, {{-50, 0, 20}, {50, 0, 20}}, 1.0);
    Surface hollow =
        polyline(d, {{-20, 0, 0}, {-20, 0, -50}, {20, 0, -50}, {20, 0, 0}, {-20, 0, 0}}, 1.0);
    const int first_vertex = static_cast<int>(closed.vertices.size());
    const int first = static_cast<int>(closed.size());
    closed.vertices.insert(closed.vertices.end(), hollow.vertices.begin(), hollow.vertices.end());
    for (std::size_t e = 0; e < hollow.size(); ++e) {
        const auto& c = hollow.corners[e];
        add_element(closed, {c[0] + first_vertex, c[1] + first_vertex, -1, -1});
        closed.chain.back() = 1;
        closed.next.push_back(first + static_cast<int>((e + 1) % hollow.size()));
        closed.previous.push_back(first +
                                  static_cast<int>((e + hollow.size() - 1) % hollow.size()));
    }
    CHECK_FALSE(floor_of(d, closed, site));
    CHECK_FALSE(cd_at(d, closed, site, 10));
    CHECK(cd_at(d, closed, site, -10)->value == near(40)); // the void itself can be measured
}

TEST_CASE("features across a side and beside others", "[metrology]") {
    SECTION("half a trench at a mirror") {
        const Domain d = line_period(60);
        const Surface s = polyline(
            d, {{-30, 0, 10}, {12.5, 0, 10}, {12.5, 0, 0}, {15, 0, -40}, {30, 0, -40}}, 1.0);
        const FeatureSite site = site_at(30, 35);
        CHECK(cd_at(d, s, site, -20)->value == near(2 * (30 - 13.75)));
        CHECK(response(*cd_at(d, s, site, 5), s, [](const Vec3&) { return 1.0; }) == near(-2));
        const auto angles = sidewall_angles(d, s, site, -36, -4);
        REQUIRE(angles);
        CHECK(angles->left.value == near(90 - std::atan(2.5 / 40) * 180 / pi));
        CHECK(angles->right.value == near(angles->left.value));
        CHECK(floor_of(d, s, site)->right_edge.value == near(-40));
        CHECK(top_between(d, s, 45, 60, 0)->value == near(10)); // mirrored mask
    }
    SECTION("a trench that wraps round a periodic side") {
        const Domain d = line_period(100, Sides::periodic);
        const Surface s = polyline(
            d, {{-50, 0, -30}, {-38, 0, -30}, {-38, 0, 5}, {30, 0, 5}, {30, 0, -30}, {50, 0, -30}},
            1.0);
        for (const double x : {-54.0, 46.0, 146.0}) {
            const FeatureSite site = site_at(x, 32);
            CHECK(cd_at(d, s, site, -10)->value == near(32));
            CHECK(floor_of(d, s, site)->deepest.value == near(-30));
        }
    }
    SECTION("the opening asked for, not its neighbour") {
        const Domain d = line_period(200);
        const Surface s = polyline(d,
                                   {{-100, 0, 12},
                                    {-60, 0, 12},
                                    {-60, 0, -25},
                                    {-40, 0, -25},
                                    {-40, 0, 12},
                                    {20, 0, 12},
                                    {20, 0, -50},
                                    {70, 0, -50},
                                    {70, 0, 12},
                                    {100, 0, 12}},
                                   1.0);
        CHECK(cd_at(d, s, site_at(-50, 20), -5)->value == near(20));
        CHECK(cd_at(d, s, site_at(45, 50), -5)->value == near(50));
        CHECK_FALSE(cd_at(d, s, site_at(-50, 20), -30));
        CHECK(floor_of(d, s, site_at(-50, 20))->centre.value == near(-25));
        // The axis stands in the solid: the gap that covers most of the opening as drawn counts.
        CHECK(cd_at(d, s, site_at(-62, 20), -5)->value == near(20));
        CHECK_FALSE(cd_at(d, s, site_at(-10, 20), -5));
    }
}

TEST_CASE("the mask's facet and what is left of it", "[metrology]") {
    const Domain d = line_period(200);
    // Left facet 45 deg and 14.14 long, right facet 60 deg and 12 long; a neighbour's is 30 deg.
    const double r = 6, rz = 6 * std::sqrt(3.0);
    const Surface s = polyline(d,
                               {{-100, 0, 40},
                                {-30, 0, 40},
                                {-20, 0, 30},
                                {-20, 0, -20},
                                {20, 0, -20},
                                {20, 0, 38 - rz},
                                {20 + r, 0, 38},
                                {50, 0, 38},
                                {50 + 5 * std::sqrt(3.0), 0, 33},
                                {50 + 5 * std::sqrt(3.0), 0, -20},
                                {100, 0, -20}},
                               1.0);
    const FeatureSite site = site_at(0, 40);
    const auto facet = mask_facet_angle(d, s, site, 0);
    REQUIRE(facet);
    const double left = 10 * std::sqrt(2.0), right = 12;
    CHECK(facet->value == near((45 * left + 60 * right) / (left + right)));
    CHECK(response(*facet, s, [](const Vec3&) { return 1.0; }) == near(0));
    // Displacement growing by 1 % along the walk down the left facet makes it shallower by 0.01
    // rad.
    const auto tilt = [&](const Vec3& c) {
        return c.x < 0 ? 0.01 * (c.x - c.z) / std::sqrt(2.0) : 0;
    };
    CHECK(response(*facet, s, tilt) ==
          Approx(-0.01 * 180 / pi * left / (left + right)).epsilon(0.01));
    CHECK(top_between(d, s, -100, -20, 0)->value == near(40));
    CHECK(top_between(d, s, 20, 50, 0)->value == near(38));
    CHECK(top_between(d, s, -27.5, -20, 0)->value == near(37.5));
}

TEST_CASE("round holes", "[metrology]") {
    Domain d;
    d.symmetry = Symmetry::full;
    d.cells_x = d.cells_y = 80;
    const int around = 64;
    const Surface s = revolved_hole(d, {{20, 0}, {26, -40}, {15, -90}, {0, -95}}, around);
    FeatureSite site = site_at(0, 40);
    site.width_y = 40;
    site.round = true;
    // The rings are regular polygons with corners on both axes.
    const double polygon = std::sqrt(0.5 * around * std::sin(2 * pi / around) / pi);
    for (const double z : {-10.0, -40.0, -65.0}) {
        const double radius = z >= -40 ? 20 - 6 * z / 40 : 26 - 11 * (-40 - z) / 50;
        CHECK(cd_at(d, s, site, z)->value == near(2 * radius));
        CHECK(cd_y_at(d, s, site, z)->value == near(2 * radius));
        CHECK(cd_area_at(d, s, site, z)->value == near(2 * radius * polygon));
    }
    CHECK_FALSE(cd_area_at(d, s, site, 1));
    CHECK_FALSE(cd_area_at(d, s, site, -96));
    const auto bow = widest_cd(d, s, site, -90, 0);
    REQUIRE(bow);
    CHECK(bow->cd.value == near(52));
    CHECK(bow->z == near(-40));
    const auto angles = sidewall_angles(d, s, site, -39, -1);
    REQUIRE(angles);
    CHECK(angles->left.value == near(90 + std::atan(6.0 / 40) * 180 / pi));
    CHECK(angles->right.value == near(angles->left.value));
    const auto floor = floor_of(d, s, site);
    REQUIRE(floor);
    CHECK(floor->centre.value == near(-95));

    SECTION("the area's response to a conformal film") {
        // A wall 1e-4 thicker all round: the polygon's apothem shrinks by 1e-4 / |n in the plane|.
        const auto area = cd_area_at(d, s, site, -20);
        const double film = 1e-4, apothem = 23 * std::cos(pi / around);
        const double slope = 6.0 / 40 * std::cos(pi / around);
        const double after = (apothem - film * std::hypot(1, slope)) / std::cos(pi / around);
        CHECK(response(*area, s, [&](const Vec3&) { return film; }) ==
              Approx(2 * polygon * (after - 23)).epsilon(1e-9));
    }
    SECTION("a quarter of the hole in the corner of a mirror period") {
        Domain quarter = d;
        quarter.cells_x = quarter.cells_y = 40;
        Surface part;
        part.vertices = s.vertices;
        for (Vec3& v : part.vertices) {
            for (int a = 0; a < 2; ++a)
                if (std::fabs(v[a]) < 1e-9) v[a] = 0;
            v -= Vec3(20, 20, 0);
        }
        for (std::size_t e = 0; e < s.size(); ++e)
            if (s.centre[e].x > 0 && s.centre[e].y > 0) add_element(part, s.corners[e]);
        FeatureSite corner = site;
        corner.centre_x = corner.centre_y = -20;
        CHECK(cd_at(quarter, part, corner, -40)->value == Approx(52).margin(1e-8));
        CHECK(cd_y_at(quarter, part, corner, -40)->value == Approx(52).margin(1e-8));
        REQUIRE(cd_area_at(quarter, part, corner, -40));
        CHECK(cd_area_at(quarter, part, corner, -40)->value == near(52 * polygon));
    }
}
