// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "engine/simulation.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

using namespace rille;
using tests::TrenchCase;

namespace {

constexpr double width = 40, speed = 2; // nm, nm/s

/// A trench of 40 nm sputtered at 2 nm/s straight down; what leaves sticks with this probability,
/// as film, on film and mask. The mask does not etch.
TrenchCase milled(double sticking, double time_s, bool by_products = true) {
    TrenchCase t(80, 1, 80, 400);
    t.add_opening("trench", width);
    t.set_ions(speed * 50, tests::straight_down());
    tests::etch_by_ions(t, 0, tests::flat_yield(1));
    t.add_step("mill", time_s);
    if (!by_products) return t;
    const int atoms = t.add_neutral("atoms", 0);
    t.c.mechanism.cosine_power = {1};
    auto& film = t.chemistry(0).processes;
    const fluxes::Leavings leaves{{atoms, 1}};
    auto& sputtering = std::get<fluxes::PhysicalSputtering>(film.front());
    sputtering.leaves = leaves;
    const fluxes::Tallies tallies = sputtering.tallies;
    film.push_back(fluxes::Deposition{atoms, -1, sticking, 50, 0, {}});
    for (const int other : {1, 2}) {
        t.chemistry(other).coverages = {"redeposited atoms"};
        t.chemistry(other).processes.push_back(
            fluxes::Redeposition{atoms, 0, sticking, 50, 0, {{tallies, leaves}}});
    }
    return t;
}

double metric(const engine::Case& c, const engine::RunResult& run, const std::string& name) {
    for (const auto& m : engine::measure(c, run.last).metrics)
        if (m.name == name && m.value) return *m.value;
    FAIL("no " << name);
    return 0;
}

/// Thickness of the film on the left wall at height z [nm], by the mean over one nm.
double film_at(const engine::SurfaceState& state, double z) {
    double sum = 0, length = 0;
    const auto& s = state.surface;
    for (std::size_t e = 0; e < s.size(); ++e) {
        if (s.centre[e].x > 0 || s.normal[e].x < 0.5 || std::fabs(s.centre[e].z - z) > 2) continue;
        for (const auto& film : state.grown.thickness)
            sum += s.area[e] * film[e];
        length += s.area[e];
    }
    return length > 0 ? sum / length : 0;
}

} // namespace

TEST_CASE("sputtered atoms settle on the wall as the floor is seen from it",
          "[validation][redeposition]") {
    // Oracle: at height D above the floor a vertical wall receives (1 - D / sqrt(D^2 + w^2)) / 2 of
    // what the floor emits; with what ions take of the sloping film again that leaves the thickness
    // (depth) x that factor at the present D, to first order in depth over width.
    // Source: view factor of a strip; characteristics of h_t = v (F + h_z), derived here.
    // Tolerance: 6 % at a depth of a twentieth of the width; sticking 0.85 must fail.
    for (const double sticking : {1.0, 0.85}) {
        const TrenchCase t = milled(sticking, 1.0);
        const auto run = tests::run_quietly(t.c);
        REQUIRE(run.record.failure.empty());
        int misses = 0;
        for (const double z : {10.0, 20.0, 30.0, 40.0}) {
            const double depth = speed, above = z + depth;
            const double expected = depth * 0.5 * (1 - above / std::hypot(above, width));
            const double found = film_at(run.last, z);
            CAPTURE(sticking, z, found, expected);
            if (sticking == 1) CHECK(found == Approx(expected).epsilon(0.06));
            misses += std::fabs(found / expected - 1) > 0.06;
        }
        CHECK((misses == 0) == (sticking == 1));
    }
}

TEST_CASE("redeposit makes milled walls taper", "[validation][redeposition]") {
    // Oracle: without return the walls stay vertical under a beam straight down. With it they lean
    // out, and the film on the mask is thickest near the floor. At the foot of a wide trench growth
    // (1 - sin a) / 2 and removal sin a of the floor's rate balance at sin a = 1/3, 19.5 degrees
    // from vertical; higher up, where less returns, the wall is steeper.
    // Source: view factor of the floor from a wall that leans by a, derived here.
    // Tolerance: trends; 0.02 nm where nothing may change. The angle between 6 and 20 degrees.
    const auto run = [](const TrenchCase& t) {
        auto result = tests::run_quietly(t.c);
        INFO(result.record.failure);
        REQUIRE(result.record.failure.empty());
        return result;
    };
    const TrenchCase none = milled(0, 20, false), gas = milled(0, 20), sticky = milled(1, 20);
    const auto without = run(none), escaped = run(gas), returned = run(sticky);
    const double straight = metric(none.c, without, "sidewall angle left");
    CHECK(straight == Approx(90).margin(0.3));
    CHECK(metric(gas.c, escaped, "sidewall angle left") == Approx(straight).margin(1e-6));
    CHECK(metric(gas.c, escaped, "depth centre") ==
          Approx(metric(none.c, without, "depth centre")).margin(0.02));
    for (const auto& film : escaped.last.grown.thickness)
        for (const double h : film)
            CHECK(h == 0);
    const double lean = 90 - metric(sticky.c, returned, "sidewall angle left");
    CAPTURE(lean, film_at(returned.last, 5), film_at(returned.last, 40));
    CHECK(lean > 6);
    CHECK(lean < 20);
    CHECK(film_at(returned.last, 5) > film_at(returned.last, 40));
    CHECK(film_at(returned.last, 40) > 0.5);
    // The floor between leaning walls receives no more than it loses.
    CHECK(metric(sticky.c, returned, "depth centre") <
          metric(none.c, without, "depth centre") + 0.02);
    CHECK(metric(sticky.c, returned, "depth centre") >
          0.8 * metric(none.c, without, "depth centre"));
}
