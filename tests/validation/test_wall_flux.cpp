// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"
#include "tests/geometry/etch_loop.hpp"
#include "tests/support/run_quietly.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

using namespace rille;
using namespace rille::tests;

namespace {

constexpr double width = 40;

/// Flux onto a point of a trench of this depth, relative to the open field, for slopes of standard
/// deviation sigma: on the floor at x from the axis, and on a wall that leans by `tilt` [rad] and
/// sees slopes up to s_max.
double floor_flux(double x, double depth, double sigma) {
    const double scale = 1 / (std::sqrt(2.0) * sigma * depth);
    return 0.5 * (std::erf((0.5 * width + x) * scale) + std::erf((0.5 * width - x) * scale));
}
double wall_flux(double tilt, double s_max, double sigma) {
    double sum = 0;
    const int n = 4000;
    const double low = -std::tan(tilt), high = std::min(s_max, 8 * sigma);
    for (int i = 0; i < n; ++i) {
        const double s = low + (high - low) * (i + 0.5) / n;
        sum += (std::sin(tilt) + s * std::cos(tilt)) * std::exp(-0.5 * s * s / (sigma * sigma));
    }
    return sum * (high - low) / n / (sigma * std::sqrt(2 * pi));
}

TrenchCase etched_trench(double spacing, double mask, double sigma, double tilt_deg = 0) {
    TrenchCase t(80, spacing, mask, 2000);
    t.c.mask.sidewall_angle_deg = 90 - tilt_deg;
    t.add_opening("trench", width);
    t.set_ions(50, fluxes::IonDistribution::gaussian(100, sigma));
    etch_by_ions(t, 0, flat_yield(1));
    t.add_step("main", 1e5);
    return t;
}

/// Mean over bins of five cells of the left wall between two heights, against the exact mean.
struct WallErrors {
    double bin = 0, wall = 0;
};
template <class Value, class Exact>
WallErrors compare_wall(const geometry::Surface& s, double low, double high, double bin,
                        const Value& value, const Exact& exact) {
    const int bins = static_cast<int>((high - low) / bin);
    std::vector<double> got(bins, 0), wanted(bins, 0);
    for (std::size_t e = 0; e < s.size(); ++e) {
        if (s.centre[e].x > 0 || s.normal[e].x < 0.9) continue;
        const int b = static_cast<int>(std::floor((s.centre[e].z - low) / bin));
        if (b < 0 || b >= bins) continue;
        got[b] += value(e) * s.area[e];
        wanted[b] += exact(s.centre[e]) * s.area[e];
    }
    WallErrors worst;
    double all_got = 0, all_wanted = 0;
    for (int b = 0; b < bins; ++b) {
        worst.bin = std::max(worst.bin, std::fabs(got[b] / wanted[b] - 1));
        all_got += got[b];
        all_wanted += wanted[b];
    }
    worst.wall = std::fabs(all_got / all_wanted - 1);
    return worst;
}

} // namespace

// Oracle: floor 1/2 [erf(...) + erf(...)], wall integral of slope over the visible slopes.
// Source: flux balance of a distribution of slopes, derived here.
// Tolerance: 1.0, 0.5, 0.25 % at 20, 40, 80 cells across, of every element off the corners.
TEST_CASE("direct flux on the initial front of a trench", "[validation][flux]") {
    const double depth = 80, sigma = 0.15;
    const int cells = GENERATE(20, 40, 80);
    TrenchCase t = etched_trench(width / cells, depth, sigma);
    engine::Simulation simulation(t.c);
    const auto& flux = simulation.arrivals().ion_flux[0];
    const auto& s = simulation.surface();
    double floor = 0, wall = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const double h = width / cells, x = s.centre[e].x, z = s.centre[e].z;
        if (std::fabs(x) < 0.5 * width - h && z < h)
            floor = std::max(floor, std::fabs(flux[e] / 50 / floor_flux(x, depth, sigma) - 1));
        if (std::fabs(s.normal[e].x) > 0.9 && z > 2 * h && z < depth - 2 * h)
            wall = std::max(wall,
                            std::fabs(flux[e] / 50 / wall_flux(0, width / (depth - z), sigma) - 1));
    }
    WARN(cells << " cells: floor off by " << 100 * floor << " %, wall by " << 100 * wall << " %");
    CHECK(floor < 0.2 / cells);
    CHECK(wall < 0.2 / cells);
}

// Oracle: (sigma / sqrt(2 pi)) [1 - exp(-w^2 / (2 sigma^2 z^2))].
// Source: derived here. Tolerance: 3 % per bin of five cells.
TEST_CASE("first-step rate of a wall", "[validation][flux]") {
    const double depth = 100, spacing = 2, degrees = GENERATE(1.0, 2.0, 4.0);
    const double sigma = std::tan(degrees * pi / 180);
    TrenchCase t = etched_trench(spacing, depth, sigma);
    etch_by_ions(t, 1, flat_yield(1));
    engine::Simulation simulation(t.c);
    const auto& step = simulation.arrivals();
    const auto errors = compare_wall(
        simulation.surface(), 2 * spacing, depth - 2 * spacing, 5 * spacing,
        [&](std::size_t e) { return step.response[e].rate; },
        [&](const geometry::Vec3& p) {
            const double z = depth - p.z, reach = width / (sigma * z);
            return sigma / std::sqrt(2 * pi) * (1 - std::exp(-0.5 * reach * reach));
        });
    WARN(degrees << " deg: bins off by up to " << 100 * errors.bin << " %, wall by "
                 << 100 * errors.wall << " %");
    CHECK(errors.bin < 0.03);
    CHECK(errors.wall < 0.01);
}

// Oracle: integral of (sin tilt + slope cos tilt) over the slopes seen past the other wall's top.
// Source: derived here. Tolerance: 5 % per bin of five cells, 1 % over the wall, after 500 steps of
// the front with all that belongs to them.
TEST_CASE("ion flux onto a leaning wall after 500 steps", "[validation][flux]") {
    const double tilt_deg = GENERATE(0.2, 1.15, 3.0);
    const double mask = 100, spacing = 2, sigma = std::tan(pi / 180);
    const double tilt = tilt_deg * pi / 180;
    TrenchCase t = etched_trench(spacing, mask, sigma, tilt_deg);
    engine::Simulation simulation(t.c);
    while (simulation.health().sub_steps < 500)
        simulation.step(std::numeric_limits<double>::infinity());
    const auto& step = simulation.arrivals();
    const double top = 0.5 * width + mask * std::tan(tilt); // the other wall's edge
    const auto errors = compare_wall(
        simulation.surface(), 4 * spacing, mask - 2 * spacing, 5 * spacing,
        [&](std::size_t e) { return step.ion_flux[0][e] / 50; },
        [&](const geometry::Vec3& p) {
            return wall_flux(tilt, (top - p.x) / (mask - p.z), sigma);
        });
    WARN(tilt_deg << " deg: bins off by up to " << 100 * errors.bin << " %, wall by "
                  << 100 * errors.wall << " %; " << simulation.health().sub_steps << " steps");
    CHECK(errors.bin < 0.05);
    CHECK(errors.wall < 0.01);
}

namespace {

/// A trench in one film, walls tilted, that recedes at a + b cos(angle) of the normal from the
/// upward direction: each plane moves on as a plane. Lengths in cells, rates in cells a step.
struct MovingWalls {
    static constexpr double half = 8, depth = 60, a = 0.02, b = 0.05;
    double tilt = 0;
    double time = 0;
    geometry::Domain domain =
        make_domain(geometry::Symmetry::extruded, geometry::Sides::mirror, 1, 70);
    geometry::Surface surface;

    /// Half of the exact width at height z.
    double half_at(double z) const {
        const double moved = (a + b * std::sin(tilt)) * time;
        return half + z * std::tan(tilt) + moved / std::cos(tilt);
    }
    double top() const { return -(a + b) * time; }
    /// Where the wall's plane ends and the arc of radius a t about the moved foot begins.
    double wall_end() const { return -depth - b * time + a * time * std::sin(tilt); }

    void move(int steps) {
        geometry::Front front(
            domain,
            [&](const Vec3& p) {
                const double wall = (half - std::fabs(p.x)) * std::cos(tilt) + p.z * std::sin(tilt);
                return std::max(std::min(wall, p.z + depth), p.z);
            },
            -depth, 0);
        const auto angles = even_angles(-pi, pi, 720);
        surface = geometry::extract_surface(front);
        for (int n = 0; n < steps; ++n) { // geometry anew after each
            const auto rates =
                make_rates(surface, angles, 1, [](const auto&, int, int, double angle) {
                    return a + b * std::max(0.0, std::cos(angle));
                });
            geometry::GrownFilms films{{0}, {std::vector<double>(surface.size(), 0.0)}};
            geometry::AdvanceLimits limits;
            limits.time = 1;
            const auto report =
                geometry::advance(front, surface, rates, one_film(), films,
                                  std::vector<int>(surface.size(), 0), -1e9, limits);
            REQUIRE(report.time == 1);
            time += 1;
            surface = geometry::extract_surface(front);
        }
    }

    /// Leans the walls by 0.3 deg to and fro, each way over a bin of five cells.
    void shake() {
        for (Vec3& v : surface.vertices) {
            const double part = std::fmod(v.z - (wall_end() + 8) + 1000, 10);
            v.x += (part < 5 ? part : 10 - part) * std::tan(0.3 * pi / 180);
        }
        for (std::size_t e = 0; e < surface.size(); ++e) {
            const Vec3 from = surface.vertices[surface.corners[e][0]];
            const Vec3 along = surface.vertices[surface.corners[e][1]] - from;
            surface.centre[e] = from + along * 0.5;
            surface.area[e] = along.length();
            surface.normal[e] = Vec3(-along.z, 0, along.x) / along.length();
        }
    }

    WallErrors errors(double sigma) const {
        const geometry::RayCaster caster(domain, surface, top() + 4);
        const tests::TabulatedIons ions(
            domain, surface, caster,
            {{"X+", 40, 1.0, fluxes::IonDistribution::gaussian(100, sigma)}}, {}, {});
        return compare_wall(
            surface, wall_end() + 8, top() - 7, 5,
            [&](std::size_t e) { return ions.flux(0, static_cast<int>(e)); },
            [&](const Vec3& p) {
                const double across = half_at(top()) + half_at(p.z);
                return wall_flux(tilt, across / (top() - p.z), sigma);
            });
    }
};

} // namespace

// Oracle: as above, on a wall that has moved by 10 cells and its opening down by 35. A wall keeps
// its plane under any rate that depends on the normal alone: half width half + z tan(tilt) + R t /
// cos(tilt). Source: derived here. Tolerance: 5 % per bin of five cells, 1 % over the wall, 0.002
// cell of place, 7 cells or more below the rim (which is cut by half a cell) and 8 above the foot.
// A lean of 0.3 deg to and fro must fail.
TEST_CASE("ion flux onto a moving wall after 500 steps", "[validation][flux]") {
    const double tilt_deg = GENERATE(0.2, 1.15, 3.0), sigma = std::tan(pi / 180);
    MovingWalls walls;
    walls.tilt = tilt_deg * pi / 180;
    walls.move(500);
    double off = 0;
    for (const Vec3& v : walls.surface.vertices)
        if (v.x < 0 && v.z < walls.top() - 7 && v.z > walls.wall_end() + 8)
            off = std::max(off, std::fabs(-v.x - walls.half_at(v.z)) * std::cos(walls.tilt));
    const WallErrors moved = walls.errors(sigma);
    walls.shake();
    const WallErrors shaken = walls.errors(sigma);
    WARN(tilt_deg << " deg: place off by " << off << " cell, bins by " << 100 * moved.bin
                  << " %, wall by " << 100 * moved.wall << " %; shaken by 0.3 deg: bins by "
                  << 100 * shaken.bin << " %");
    CHECK(off < 0.002);
    CHECK(moved.bin < 0.05);
    CHECK(moved.wall < 0.01);
    CHECK(shaken.bin > 0.05); // should fail
}
