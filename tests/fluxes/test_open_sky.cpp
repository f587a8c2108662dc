// SPDX-License-Identifier: Apache-2.0
#include "fluxes/open_sky.hpp"
#include "tests/support/brute_caster.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Sides;
using geometry::Surface;
using geometry::Vec3;

namespace {

constexpr double pi = 3.14159265358979323846;

/// Adds a closed chain through `points`: anticlockwise for a void, clockwise for a piece of solid.
void add_loop(Surface& s, const std::vector<Vec3>& points, int chain) {
    const int first = static_cast<int>(s.size());
    const int n = static_cast<int>(points.size());
    const int base = static_cast<int>(s.vertices.size());
    for (const Vec3& p : points)
        s.vertices.push_back(p);
    for (int i = 0; i < n; ++i) {
        tests::add_element(s, {base + i, base + (i + 1) % n, -1, -1});
        s.chain.back() = chain;
        s.next.push_back(first + (i + 1) % n);
        s.previous.push_back(first + (i + n - 1) % n);
    }
}

std::vector<Vec3> circle(double x, double z, double radius, int n, bool clockwise) {
    std::vector<Vec3> points;
    for (int i = 0; i < n; ++i) {
        const double a = (clockwise ? -2 : 2) * pi * i / n;
        points.push_back({x + radius * std::cos(a), 0, z + radius * std::sin(a)});
    }
    return points;
}

Domain period(Sides sides) {
    Domain d;
    d.sides = sides;
    d.cells_x = 80;
    return d;
}

double seen_share(const Domain& d, const Surface& s, int e, double phi) {
    const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
    int open = 0;
    for (int i = 0; i < 200; ++i)
        open += tests::brute_hit(d, s, a + (b - a) * ((i + 0.5) / 200), phi, e, 6) < 0;
    return open / 200.0;
}

} // namespace

TEST_CASE("open sky: closed voids are dark and do not matter", "[direct]") {
    // Oracle: the same surface without the void.  Source: nothing shines through solid.
    // Tolerance: none.
    const Domain d = period(GENERATE(Sides::mirror, Sides::periodic));
    const Surface open = tests::trench(d, 30, 60, 2.0);
    Surface with_void = open;
    add_loop(with_void, circle(25, -30, 6, 24, false), 1);
    const OpenSky a(d, open), b(d, with_void);
    CHECK_FALSE(b.floating_pieces());
    const InPlane plane = resolve_in_plane(GaussianSlopes{100, 0.2});
    for (std::size_t e = 0; e < with_void.size(); ++e) {
        if (e < open.size()) CHECK(b.flux(plane, int(e)) == a.flux(plane, int(e)));
        if (e >= open.size()) {
            CHECK(b.flux(plane, int(e)) == 0);
            CHECK(b.visible(int(e), 0.5).empty());
        }
    }
}

TEST_CASE("open sky: floating pieces cast shadows", "[direct]") {
    // Oracle: plain search of all segments for beams; total flux = incident for a broad
    // distribution. Source: independent code; conservation. Tolerance: one part in eight of an
    // element at a shadow edge (its flux is taken at eight points);
    //            1 % of the total; without the shadow the total must be off.
    const Domain d = period(GENERATE(Sides::mirror, Sides::periodic));
    Surface s = tests::trench(d, 50, 60, 2.0);
    const std::size_t fixed = s.size();
    add_loop(s, circle(-5, -20, 8, 24, true), 1);
    const OpenSky sky(d, s);
    REQUIRE(sky.floating_pieces());
    for (double phi : {-0.6, 0.0, 0.3}) {
        const InPlane plane =
            resolve_in_plane(IonBeam{100, Vec3(-std::sin(phi), 0, -std::cos(phi))});
        for (int e = 0; e < int(s.size()); ++e) {
            const double facing =
                (s.normal[e].x * std::sin(phi) + s.normal[e].z * std::cos(phi)) / std::cos(phi);
            const double expected = facing > 0 ? facing * seen_share(d, s, e, phi) : 0.0;
            CAPTURE(phi, e, s.centre[e].x, s.centre[e].z);
            CHECK(std::fabs(sky.flux(plane, e) - expected) < 0.13 * std::max(1.0, facing));
        }
    }
    const InPlane broad = resolve_in_plane(GaussianSlopes{100, 0.3});
    double all = 0, without = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const double part = sky.flux(broad, int(e)) * s.area[e];
        all += part;
        if (e < fixed) without += part;
    }
    CHECK(all == Approx(80).epsilon(0.01));
    CHECK(without < 0.95 * 80);
}

TEST_CASE("open sky: a period may start anywhere", "[direct]") {
    // Oracle: the same periodic surface moved by part of a period.
    // Source: nothing happens at the side of a period.
    // Tolerance: 1e-12.
    const Domain d = period(Sides::periodic);
    const InPlane plane = resolve_in_plane(GaussianSlopes{100, 0.5});
    const std::vector<Vec3> shape = {{-40, 0, -7}, {-20, 0, 0},  {-24, 0, -30}, {0, 0, -40},
                                     {10, 0, -12}, {15, 0, -15}, {40, 0, -7}};
    const std::vector<Vec3> moved = {{-40, 0, -40}, {-30, 0, -12}, {-25, 0, -15}, {0, 0, -7},
                                     {20, 0, 0},    {16, 0, -30},  {40, 0, -40}};
    const Surface a = tests::polyline(d, shape, 2.0), b = tests::polyline(d, moved, 2.0);
    const OpenSky sky_a(d, a), sky_b(d, b);
    REQUIRE(a.size() == b.size());
    for (std::size_t e = 0; e < a.size(); ++e)
        for (std::size_t f = 0; f < b.size(); ++f) {
            const double x = std::remainder(b.centre[f].x - a.centre[e].x - 40, 80);
            if (std::fabs(x) > 1e-9 || std::fabs(b.centre[f].z - a.centre[e].z) > 1e-9) continue;
            CHECK(std::fabs(sky_a.flux(plane, int(e)) - sky_b.flux(plane, int(f))) < 1e-12);
        }
}
