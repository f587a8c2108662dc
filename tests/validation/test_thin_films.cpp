// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <string>

using namespace rille;
using namespace rille::tests;

namespace {

/// Replaces the film of a trench case by films given from the top, each a material and a thickness,
/// on the stop.
void lay_films(TrenchCase& t, const std::vector<std::pair<int, double>>& films) {
    auto& list = t.c.films;
    list.resize(1);
    double z = 0;
    for (const auto& [material, thickness] : films) {
        list.push_back({"film " + std::to_string(list.size()), material, z, z - thickness});
        z -= thickness;
    }
    list.push_back({"stop", 2, z, -std::numeric_limits<double>::infinity()});
}

double time_to_stop(TrenchCase& t) {
    t.run_until_reached("stop", "trench", 1e4);
    const auto outcome = run_quietly(t.c);
    REQUIRE(outcome.record.steps.size() == 1);
    INFO(outcome.record.steps[0].reason);
    REQUIRE(outcome.record.status == "done");
    return outcome.record.steps[0].end_s;
}

/// Materials 0 and 3 as two films, etched by ions at 1.2 and 0.24 nm/s; h = 2 nm.
TrenchCase two_materials() {
    TrenchCase t(80, 2, 24, 50);
    t.add_opening("trench", 50);
    t.set_ions(60, straight_down());
    etch_by_ions(t, 0, flat_yield(1.0));
    etch_by_ions(t, 3, flat_yield(0.2));
    return t;
}

} // namespace

// Oracle: the time to clear a stack is the sum of thickness / rate of its films.
// Source: derived here. Tolerance: 0.5 %.
TEST_CASE("five thin films clear in the exact time", "[validation][films]") {
    TrenchCase t = two_materials();
    lay_films(t, {{0, 0.6}, {3, 0.7}, {0, 0.9}, {3, 0.5}, {0, 1.1}});
    const double exact = 2.6 / 1.2 + 1.2 / 0.24, time = time_to_stop(t);
    WARN("five films: " << time / exact - 1 << " of the time too long");
    CHECK(time == Approx(exact).epsilon(0.005));
    CHECK_FALSE(time == Approx((2.6 + 1.2) / 1.2).epsilon(0.005)); // had one rate served all
}

TEST_CASE("sixty-four pairs of films thinner than a cell", "[validation][films]") {
    TrenchCase t = two_materials();
    std::vector<std::pair<int, double>> films;
    for (int pair = 0; pair < 64; ++pair) {
        films.push_back({0, 0.5});
        films.push_back({3, 0.3});
    }
    lay_films(t, films);
    const double exact = 64 * (0.5 / 1.2 + 0.3 / 0.24), time = time_to_stop(t);
    WARN("64 pairs: " << time / exact - 1 << " of the time too long");
    CHECK(time == Approx(exact).epsilon(0.005));
}

TEST_CASE("a liner thinner than a cell is opened first", "[validation][films]") {
    TrenchCase t = two_materials();
    lay_films(t, {{0, 5}});
    t.c.liner_thickness = 1.3;
    t.c.liner_material = 3;
    const double exact = 1.3 / 0.24 + 5 / 1.2, time = time_to_stop(t);
    WARN("liner: " << time / exact - 1 << " of the time too long");
    CHECK(time == Approx(exact).epsilon(0.005));
}

// Oracle: a step that waits for the open field ends when the flat film is gone; one that waits for
// a feature under ions without spread ends at the same time.
// Source: derived here. Tolerance: 1e-3 of the time that half a cell takes.
TEST_CASE("a step ends when its film is reached", "[validation][films]") {
    const std::string at = GENERATE("open field", "trench");
    const double thickness = GENERATE(17.3, 16.01, 9.77);
    TrenchCase t = two_materials();
    lay_films(t, {{0, thickness}});
    t.run_until_reached("stop", at, 1e4);
    const auto outcome = run_quietly(t.c);
    REQUIRE(outcome.record.status == "done");
    const double late = outcome.record.steps[0].end_s - thickness / 1.2;
    CAPTURE(at, thickness, late);
    CHECK(std::fabs(late) < 1e-3 * 1.0 / 1.2);
}

// Oracle: the floor's centre stands at the film's top when the step ends, on a floor that bulges
// under ions of wide spread. Source: derived here. Tolerance: 1e-3 of half a cell, which is the
// most that a step moves.
TEST_CASE("a step ends when a bulging floor reaches its film", "[validation][films]") {
    TrenchCase t = two_materials();
    t.plasma().ion_energies.clear();
    t.plasma().ion_energies.emplace("X+", fluxes::IonDistribution::gaussian(100, 0.3));
    lay_films(t, {{0, 17.3}});
    t.run_until_reached("stop", "trench", 1e4);
    const auto outcome = run_quietly(t.c);
    REQUIRE(outcome.record.status == "done");
    const auto floor =
        geometry::floor_of(t.c.domain, outcome.last.surface, engine::feature_sites(t.c)[0]);
    REQUIRE(floor);
    CAPTURE(floor->centre.value, floor->left_edge.value);
    CHECK(floor->left_edge.value > floor->centre.value + 0.5 * t.c.domain.spacing); // it bulges
    CHECK(std::fabs(floor->centre.value + 17.3) < 1e-3 * 0.5 * t.c.domain.spacing);
}
