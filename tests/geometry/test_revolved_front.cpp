// SPDX-License-Identifier: Apache-2.0
// The front of a round feature: contour, topology, motion, carried amounts and metrology in r and
// z.
#include "geometry/extract_surface.hpp"
#include "geometry/initial_shape.hpp"
#include "geometry/isolated_parts.hpp"
#include "geometry/metrology.hpp"
#include "tests/geometry/etch_loop.hpp"
#include "tests/support/make_band.hpp"
#include "tests/support/random_rays.hpp"
#include "tests/support/revolved_shapes.hpp"

#include <catch2/catch.hpp>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

/// Volume between the front and the level z = 0, counted positive below: of 2 pi r z, by Simpson's
/// rule, exact for segments.
double volume_below(const Surface& s) {
    double sum = 0;
    for (const auto& c : s.corners) {
        const Vec3 a = s.vertices[c[0]], b = s.vertices[c[1]], m = (a + b) * 0.5;
        sum -= 2 * pi * (a.x * a.z + 4 * m.x * m.z + b.x * b.z) / 6 * (b.x - a.x);
    }
    return sum;
}

double integral(const Surface& s, const std::vector<double>& v) {
    double sum = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        sum += s.area[e] * v[e];
    return sum;
}

/// Ball of gas about a point of the axis, under a flat surface.
Front bowl(const Domain& d, double radius, double height) {
    return Front(
        d, [=](const Vec3& p) { return std::max(p.z, radius - (p - Vec3(0, 0, height)).length()); },
        height - radius, 0);
}

} // namespace

TEST_CASE("contour of a bowl in r and z", "[revolved][surface]") {
    // Oracle: sphere of radius R about a point of the axis: area 2 pi R (R + c) below z = 0, c its
    // centre's height; the sum of area times n_z is the area of the round cell.
    // Source: elementary geometry.
    // Tolerance: round-off of the sum; 0.5 % of the area and 0.05 cell at a radius of 10 cells.
    const Domain d = round_cell(20);
    for (const double height : {-2.0, -2.37, -2.81}) {
        const Front front = bowl(d, 10, height);
        const Surface s = extract_surface(front);
        double up = 0, bowl_area = 0, off = 0;
        for (std::size_t e = 0; e < s.size(); ++e) {
            up += s.area[e] * s.normal[e].z;
            if (s.centre[e].z < -0.2) bowl_area += s.area[e];
        }
        const double rim = -0.2;
        for (const Vec3& v : s.vertices)
            if (v.z < -1) off = std::max(off, std::fabs((v - Vec3(0, 0, height)).length() - 10));
        CHECK(up == Approx(d.base_area()).epsilon(1e-12));
        CHECK(bowl_area == Approx(2 * pi * 10 * (rim - height + 10)).epsilon(0.02));
        CHECK(off < 0.05);
        // The axis is no edge: the chain starts on it, looking up.
        CHECK(s.vertices[s.corners[0][0]].x == 0);
        CHECK(s.normal[0].z > 0.999);
        CHECK(s.previous[0] == -1);
        CHECK(s.vertices[s.corners.back()[1]].x == d.width_x());
        CHECK(s.next.back() == -1);
    }
}

TEST_CASE("voids and pieces of a round feature", "[revolved][topology]") {
    // Oracle: ball 4 pi R^3 / 3, torus 2 pi^2 R r^2 with its middle R from the axis.
    // Source: elementary geometry. Tolerance: 2 % of the volume, 0.1 cell.
    const Domain d = round_cell(40);
    const Vec3 ball(0, 0, -14.3), drop(0, 0, 13.2), ring(21.4, 0, -13.7);
    const auto shape = [&](const Vec3& p) {
        const double solid = std::max({p.z, 9 - (p - ball).length(), 7 - (p - ring).length()});
        return std::min(solid, (p - drop).length() - 8);
    };
    const Surface s = extract_surface(make_band(d, shape, -25, 23));
    const auto parts = find_isolated_parts(d, s);
    REQUIRE(parts.size() == 3);
    for (const IsolatedPart& part : parts) {
        if (part.kind == IsolatedPart::Kind::detached_solid) {
            CHECK(part.volume == Approx(4 * pi / 3 * 512).epsilon(0.02));
            CHECK((part.centre - drop).length() < 0.1);
        } else if (part.centre.x == 0) {
            CHECK(part.volume == Approx(4 * pi / 3 * 729).epsilon(0.02));
            CHECK((part.centre - ball).length() < 0.1);
        } else {
            CHECK(part.volume == Approx(2 * pi * pi * ring.x * 49).epsilon(0.02));
            // The mean distance from the axis of a torus is R + r^2 / (4 R).
            CHECK(std::fabs(part.centre.x - ring.x - 49 / (4 * ring.x)) < 0.1);
            CHECK(std::fabs(part.centre.z - ring.z) < 0.1);
        }
    }
}

TEST_CASE("a bubble on the axis vanishes from the contour with its last cell",
          "[revolved][surface]") {
    // Oracle: no element without area. Source: definition. Tolerance: none.
    const Domain d = round_cell(12);
    for (double radius = 0.1; radius < 2; radius += 0.07)
        for (const double z : {-6.0, -6.3, -6.5}) {
            const auto shape = [&](const Vec3& p) {
                return std::max(p.z, radius - (p - Vec3(0, 0, z)).length());
            };
            const Surface s = extract_surface(make_band(d, shape, -9, 2));
            for (const double area : s.area)
                REQUIRE(area > 0);
        }
}

TEST_CASE("isotropic etch through a round opening", "[revolved][advance]") {
    // Oracle: volume pi a^2 r + pi^2 a r^2 / 2 + 2 pi r^3 / 3; floor flat at depth r for distances
    // from the axis below a; quarter circles about the mask's edge.
    // Source: derived here (Pappus).
    // Tolerance: 1 % of the volume and 0.25 cell at 20 cells across the opening; the floor within
    // 0.01 cell, the axis included.
    const double a = 10, r = 10;
    const auto volume = [&](double rate, double& floor, double& arcs) {
        Front front(
            round_cell(32), [](const Vec3& p) { return mask_distance(p, 10, 5); }, 0, 5);
        Loop loop;
        loop.stack = masked(5);
        loop.materials = 2;
        loop.law = [=](const Surface&, int, int material, double) {
            return material == 0 ? rate : 0.0;
        };
        const double before = volume_below(extract_surface(front));
        etch(front, loop, r);
        const Surface s = extract_surface(front);
        for (const Vec3& v : s.vertices) {
            if (v.x < a - 3) floor = std::max(floor, std::fabs(v.z + rate * r));
            if (v.z < -1.5)
                arcs = std::max(arcs, std::fabs(std::hypot(std::max(0.0, v.x - a), v.z) - r));
        }
        return volume_below(s) - before;
    };
    const double exact = pi * a * a * r + pi * pi * a * r * r / 2 + 2 * pi * r * r * r / 3;
    double floor = 0, arcs = 0;
    const double off = volume(1, floor, arcs) / exact - 1;
    INFO("volume off by " << off << ", floor by " << floor << ", arcs by " << arcs);
    CHECK(std::fabs(off) < 0.01);
    CHECK(floor < 0.01);
    CHECK(arcs < 0.25);
    CHECK(std::fabs(volume(0.98, floor, arcs) / exact - 1) > 0.01); // should fail
}

TEST_CASE("a ball about the axis grows and shrinks as one", "[revolved][advance]") {
    // Oracle: sphere of radius r0 + V t. Source: elementary geometry.
    // Tolerance: 0.1 cell anywhere, on the axis 0.05 (no cusp, no dimple).
    const Domain d = round_cell(30);
    for (const double rate : {1.0, -1.0}) {
        Front front = bowl(d, 12, -16);
        Loop loop;
        loop.stack = one_film();
        loop.law = [=](const Surface& s, int e, int, double) {
            return s.centre[e].z < -1 ? rate : 0.0;
        };
        etch(front, loop, 3);
        double worst = 0, tip = 0;
        for (const Vec3& v : extract_surface(front).vertices) {
            if (v.z > -8) continue;
            const double off = std::fabs((v - Vec3(0, 0, -16)).length() - 12 - 3 * rate);
            worst = std::max(worst, off);
            if (v.x < 1) tip = std::max(tip, off);
        }
        INFO("worst " << worst << ", tip " << tip);
        CHECK(worst < 0.1);
        CHECK(tip < 0.05);
    }
}

TEST_CASE("films of a round feature keep their volume", "[revolved][carry]") {
    // Oracle: thickness times area is kept: on a wall that moves from R to R + d a film thins to
    // R / (R + d); on a floor that sinks it stays, the axis included.
    // Source: conservation. Tolerance: round-off of the integral; 1e-6 of the thickness on exact
    // surfaces, 2 % where contour and corners come from the grid.
    const Domain d = round_cell(24);
    const Surface from = round_hole(d, 10.2, 20, 0.7), deeper = round_hole(d, 10.2, 20.4, 0.63);
    std::vector<double> moved(from.size(), 0.0);
    for (std::size_t e = 0; e < from.size(); ++e)
        if (from.centre[e].z == -20) moved[e] = 0.4;
    SurfaceField film{"film", Carry::per_area, std::vector<double>(from.size(), 2.0)};
    carry_fields(from, deeper, moved, d, {&film});
    CHECK(integral(deeper, film.value) ==
          Approx(integral(from, std::vector<double>(from.size(), 2.0))).epsilon(1e-12));
    for (std::size_t e = 0; e < deeper.size(); ++e)
        if (deeper.centre[e].z == Approx(-20.4) && deeper.centre[e].x < 8)
            CHECK(film.value[e] == Approx(2).epsilon(1e-6));

    const Surface wider = frusta(d, {{0, 0, -20}, {10.7, 0, -20}, {10.7, 0, 0}, {24, 0, 0}}, 0.66);
    moved.assign(from.size(), 0.0);
    for (std::size_t e = 0; e < from.size(); ++e)
        if (from.centre[e].x == 10.2) moved[e] = 0.5;
    film.value.assign(from.size(), 2.0);
    carry_fields(from, wider, moved, d, {&film});
    CHECK(integral(wider, film.value) ==
          Approx(2 * integral(from, std::vector<double>(from.size(), 1.0))).epsilon(1e-12));
    for (std::size_t e = 0; e < wider.size(); ++e)
        if (wider.centre[e].x == Approx(10.7) && std::fabs(wider.centre[e].z + 10) < 8)
            CHECK(film.value[e] == Approx(2 * 10.2 / 10.7).epsilon(1e-6));
}

TEST_CASE("metrology of a round hole", "[revolved][metrology]") {
    // Oracle: a cone read by hand: CD is twice the radius, both walls lean alike, the floor's
    // centre lies on the axis; the level section of a ring about a pillar.
    // Source: derived here. Tolerance: 1e-9 nm, round-off.
    const Domain d = round_cell(60);
    const Surface s = frusta(
        d, {{0, 0, -78}, {4, 0, -80}, {15, 0, -80}, {20, 0, 0}, {20, 0, 30}, {60, 0, 30}}, 1);
    FeatureSite site;
    site.width_x = site.width_y = 40;
    site.round = true;
    const auto near = [](double v) { return Approx(v).margin(1e-9).epsilon(0); };
    for (const double z : {-10.1, -77.3}) {
        const auto cd = cd_at(d, s, site, z), y = cd_y_at(d, s, site, z),
                   area = cd_area_at(d, s, site, z);
        REQUIRE((cd && y && area));
        CHECK(cd->value == near(2 * (20 + z / 16)));
        CHECK(y->value == near(cd->value));
        CHECK(area->value == near(cd->value));
        // The one wall decides both sides: all of it out by 1 nm along its normal.
        double sum = 0, by_area = 0;
        for (const auto& [element, weight] : cd->elements)
            sum += weight;
        for (const auto& [element, weight] : area->elements)
            by_area += weight;
        CHECK(sum == near(-2 * std::hypot(16, 1) / 16));
        CHECK(by_area == near(sum));
    }
    const auto floor = floor_of(d, s, site);
    REQUIRE(floor);
    CHECK(floor->centre.value == near(-78));
    CHECK(floor->deepest.value == near(-80));
    const auto angles = sidewall_angles(d, s, site, -70, -5);
    REQUIRE(angles);
    CHECK(angles->left.value == near(std::atan(16.0) * 180 / pi));
    CHECK(angles->right.value == near(angles->left.value));

    const Surface ring =
        frusta(d, {{0, 0, 0}, {8, 0, 0}, {10, 0, -50}, {25, 0, -50}, {25, 0, 0}, {60, 0, 0}}, 1);
    const auto gap = cd_area_at(d, ring, site, -25);
    REQUIRE(gap);
    CHECK(gap->value == near(2 * std::sqrt(25.0 * 25 - 81)));
}

TEST_CASE("a mask with a round hole in r and z", "[revolved][shape]") {
    // Oracle: the full shape in the plane y = 0. Source: the two describe the same solid.
    // Tolerance: round-off, inside the opening's period.
    Domain full = make_domain(Symmetry::full, Sides::mirror, 1, 60, 60);
    const MaskShape mask{20, 86, 3, {{"via", Opening::Shape::round, 30, 30, 0, 0}}};
    const auto in_full = initial_distance(full, mask, 1.5);
    const auto revolved = initial_distance(round_cell(30), mask, 1.5);
    for (std::uint64_t n = 0; n < 500; ++n) {
        const Vec3 p(30 * uniform(1, n), 0, -10 + 40 * uniform(2, n));
        CHECK(revolved(p) == Approx(in_full(p)).margin(1e-12));
    }
}
