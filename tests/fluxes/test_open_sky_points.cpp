// SPDX-License-Identifier: Apache-2.0
#include "fluxes/open_sky.hpp"
#include "tests/support/brute_caster.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using fluxes::OpenSky;
using geometry::Domain;
using geometry::Sides;
using geometry::Surface;
using geometry::Vec3;

namespace {

const double pi = std::acos(-1.0);

Domain period(int cells, Sides sides) {
    Domain d;
    d.sides = sides;
    d.cells_x = cells;
    return d;
}

/// Overhanging mask over a pocket with a hook, and a slanted step beside it.
Surface crooked(const Domain& domain, double max_length) {
    return tests::polyline(domain,
                           {{-20, 0, 3},
                            {-8, 0, 3},
                            {-3, 0, 1},
                            {-4, 0, -1},
                            {-12, 0, -4},
                            {-13, 0, -2},
                            {-15, 0, -3},
                            {-14, 0, -9},
                            {2, 0, -12},
                            {9, 0, -8},
                            {4, 0, -1},
                            {3, 0, 0},
                            {5, 0, 2},
                            {14, 0, 0},
                            {20, 0, 3}},
                           max_length);
}

/// Share of `rays` evenly spaced directions on which interval and ray tracing disagree.
double disagreement(const Domain& domain, const Surface& s, double widen, int rays) {
    const OpenSky sky(domain, s);
    int wrong = 0, total = 0;
    for (int e = 0; e < int(s.size()); ++e) {
        const double psi = std::atan2(s.normal[e].x, s.normal[e].z);
        for (const double t : {0.21, 0.83}) {
            const auto a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const auto intervals = sky.visible(e, t);
            for (int i = 0; i < rays; ++i, ++total) {
                const double phi = psi + pi * ((i + 0.43) / rays - 0.5);
                const double turned = std::remainder(phi, 2 * pi);
                const bool open = std::fabs(turned) < 1.55 &&
                                  tests::brute_hit(domain, s, a + (b - a) * t, phi, e) < 0;
                const bool seen = !intervals.empty() && turned > intervals.front().low - widen &&
                                  turned < intervals.front().high && std::fabs(turned) < 1.55;
                wrong += open != seen;
            }
        }
    }
    return double(wrong) / total;
}

} // namespace

TEST_CASE("open sky: visible sky agrees with traced rays", "[direct]") {
    // Oracle: brute-force rays over 81 images of the surface.
    // Source: derived here.
    // Tolerance: no disagreement at all; a horizon off by 0.02 rad must be noticed.
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        const Domain domain = period(40, sides);
        const Surface s = crooked(domain, 4.0);
        CHECK(disagreement(domain, s, 0, 60) == 0);
        CHECK(disagreement(domain, s, 0.05, 60) > 0);
        const Surface fine = crooked(domain, 0.4); // many vertices: whole blocks are skipped
        CHECK(disagreement(domain, fine, 0, 7) == 0);
    }
}

TEST_CASE("open sky: direct cosine flux in a trench", "[direct]") {
    // Oracle: floor average sqrt(1 + AR^2) - AR; wall at depth z (1 - z / sqrt(z^2 + w^2)) / 2.
    // Source: derived here (crossed strings).
    // Tolerance: 1e-9 (three Gauss points a segment); 0.5 % off must fail.
    for (const double ratio : {1.0, 5.0, 40.0}) {
        const double w = 20, depth = ratio * w;
        const Domain domain = period(40, Sides::mirror);
        const Surface s = tests::trench(domain, w, depth, 1.0);
        const OpenSky sky(domain, s);
        double floor = 0;
        for (int e = 0; e < int(s.size()); ++e) {
            if (s.normal[e].z > 0.5) {
                if (s.centre[e].z < -1)
                    floor += sky.cosine_flux(e) * s.area[e] / w;
                else
                    CHECK(sky.cosine_flux(e) == Approx(1).epsilon(1e-12));
                continue;
            }
            const auto string = [&](double z) { return 0.5 * (z - std::sqrt(z * z + w * w)); };
            const double z = -s.centre[e].z;
            const double exact = string(z + 0.5) - string(z - 0.5);
            CHECK(sky.cosine_flux(e) == Approx(exact).epsilon(1e-9));
            CHECK(sky.cosine_flux(e) != Approx(1.005 * exact).epsilon(1e-9));
        }
        const double exact = 1 / (std::sqrt(1 + ratio * ratio) + ratio);
        CHECK(floor == Approx(exact).epsilon(1e-9));
    }
}

TEST_CASE("open sky: direct cosine flux under an overhang", "[direct]") {
    // Oracle: mask of opening 1 and thickness 0.5 over a cavity, floor 2 below its underside:
    // 0.196116, 0.185695, 0.156506 at offsets 0, 0.5, 0.8; underside dark.
    // Source: derived here.
    // Tolerance: 0.5 % asked; small segments give 1e-4.
    const Domain domain = period(4, Sides::mirror);
    const Surface s = tests::polyline(domain,
                                      {{-2, 0, 0.5},
                                       {-0.5, 0, 0.5},
                                       {-0.5, 0, 0},
                                       {-1.5, 0, 0},
                                       {-1.5, 0, -2},
                                       {1.5, 0, -2},
                                       {1.5, 0, 0},
                                       {0.5, 0, 0},
                                       {0.5, 0, 0.5},
                                       {2, 0, 0.5}},
                                      0.01);
    const OpenSky sky(domain, s);
    for (int e = 0; e < int(s.size()); ++e) {
        if (s.normal[e].z < -0.5) CHECK(sky.cosine_flux(e) == 0);
        if (s.centre[e].z > -1.99) continue;
        const double x = s.centre[e].x;
        for (const auto& [offset, exact] :
             {std::pair(0.005, 0.196116), {0.505, 0.185695}, {0.805, 0.156506}})
            if (std::fabs(std::fabs(x) - offset) < 1e-6)
                CHECK(sky.cosine_flux(e) == Approx(exact).epsilon(5e-3));
    }
}
