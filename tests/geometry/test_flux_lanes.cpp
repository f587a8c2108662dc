// SPDX-License-Identifier: Apache-2.0
// Fluxes of many cells side by side against those of one cell after the other.
#include "geometry/hamiltonian.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <random>

using namespace rille::geometry;

namespace {

constexpr double pi = 3.14159265358979323846;

/// One element whose rate peaks about the vertical and falls off to the sides.
NormalRates peaked_rates(bool extruded) {
    NormalRates r;
    for (int a = 0; a <= 120; ++a)
        r.angles.push_back((extruded ? -pi : 0) + (extruded ? 2 : 1) * pi * a / 120);
    for (const double angle : r.angles)
        r.table.push_back(0.3 + std::exp(-3 * angle * angle) - 0.2 * std::cos(2 * angle));
    r.first_row = {0, 1};
    r.material = {0};
    return r;
}

struct Outcome {
    int ordinary = 0, different = 0;
};

/// Lanes of random fronts, `bent` [cells] out of plane, against the single cell. `fault` is added
/// to one slope of the single cell.
Outcome compare_lanes(bool extruded, double bent, double fault) {
    const NormalRates rates = peaked_rates(extruded);
    const RateTables tables(rates);
    std::mt19937 random(7);
    std::uniform_real_distribution<double> unit(-1, 1);
    FluxLanes lanes;
    RateWindow windows[FluxLanes::count];
    Outcome out;
    for (int round = 0; round < 200; ++round) {
        for (int n = 0; n < FluxLanes::count; ++n) {
            const double tilt = extruded ? pi * unit(random) : 0.5 * pi * (1 + unit(random));
            const double way = pi * unit(random);
            const double slope[3] = {
                std::sin(tilt) * (extruded ? 1 : std::cos(way)),
                extruded ? 0 : std::sin(tilt) * std::sin(way),
                std::cos(tilt),
            };
            windows[n] = tables.window(0, tilt);
            for (int axis = 0; axis < 3; axis += extruded ? 2 : 1) {
                const double bend = bent * unit(random);
                lanes.back[axis][n] = slope[axis] - 0.5 * bend;
                lanes.ahead[axis][n] = slope[axis] + 0.5 * bend;
                lanes.bend[axis][n] = bend;
                lanes.bend_left[axis][n] = bent * unit(random);
                lanes.bend_right[axis][n] = n % 7 ? bent * unit(random) : bend;
            }
        }
        lanes.find_slopes(extruded, 0.8);
        tables.look_up_marks(lanes, FluxLanes::count);
        lanes.find_tilts();
        bool held[FluxLanes::count];
        for (int n = 0; n < FluxLanes::count; ++n)
            held[n] = tables.look_up_nodes(lanes, n, windows[n]);
        lanes.find_fluxes(extruded);
        for (int n = 0; n < FluxLanes::count; ++n) {
            if (!held[n] || lanes.ordinary[n] == 0) continue;
            ++out.ordinary;
            Slopes s;
            for (int axis = 0; axis < 3; ++axis) {
                s.minus[axis] = lanes.minus[axis][n];
                s.plus[axis] = lanes.plus[axis][n];
            }
            s.plus[2] += fault;
            Speed speed;
            const double change =
                lax_friedrichs(tables, {0, -1, 0}, windows[n], extruded, s, speed);
            out.different += change != lanes.change[n] || speed.rate != lanes.rate[n] ||
                             speed.waves != lanes.waves[n] ||
                             speed.smooth != (lanes.smooth[n] != 0);
        }
    }
    return out;
}

} // namespace

TEST_CASE("Fluxes side by side have the bits of fluxes one by one", "[hamiltonian]") {
    // Oracle: lax_friedrichs for a single cell, at the slopes of the lane.
    // Source: the same operations in the same order (IEEE 754).
    // Tolerance: none; a slope off by 1e-14 must show.
    for (const bool extruded : {false, true}) {
        const Outcome same = compare_lanes(extruded, 0.02, 0);
        CHECK(same.ordinary > 5000);
        CHECK(same.different == 0);
        const Outcome bent = compare_lanes(extruded, 0.2, 0);
        CHECK(bent.different == 0);
        CHECK(bent.ordinary > 100);
        CHECK(bent.ordinary < same.ordinary);
        const Outcome off = compare_lanes(extruded, 0.02, 1e-14);
        CHECK(off.different > off.ordinary / 2);
    }
}
