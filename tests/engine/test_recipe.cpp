// SPDX-License-Identifier: Apache-2.0
// How steps end: endpoints, limits, overetch, and what the record says about it.
#include "engine/metrics.hpp"
#include "geometry/check.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using tests::etch_by_ions;
using tests::flat_yield;
using tests::run_quietly;
using tests::TrenchCase;

namespace {

constexpr double open_rate = 60 * 1.0 / 50; // [nm/s] flux * yield / density
constexpr double film_thickness = 20;

/// Film and stop etch alike, so that nothing but the endpoint itself stops the front at the film.
TrenchCase even_stack(const fluxes::IonDistribution& ions) {
    TrenchCase t(80, 4, 40, film_thickness);
    t.add_opening("trench", 40);
    t.set_ions(60, ions);
    etch_by_ions(t, 0, flat_yield(1));
    etch_by_ions(t, 2, flat_yield(1));
    return t;
}

/// Ions spread so widely that the mask keeps a good part of them from the floor.
fluxes::IonDistribution spread() {
    return fluxes::IonDistribution::gaussian(100, 0.4);
}

TrenchCase until(engine::StepEnd::Kind kind, const std::string& at,
                 const fluxes::IonDistribution& ions, double limit_s = 1e3) {
    TrenchCase t = even_stack(ions);
    t.run_until_reached("stop", at, limit_s);
    t.c.steps[0].end.kind = kind;
    return t;
}

geometry::Floor floor_of(const engine::Case& c, const geometry::Surface& surface) {
    const auto floor = geometry::floor_of(c.domain, surface, engine::feature_sites(c)[0]);
    REQUIRE(floor);
    return *floor;
}

/// Highest of the places that `cleared` looks at.
double highest_floor(const engine::Case& c, const geometry::Surface& surface) {
    const auto floor = floor_of(c, surface);
    return std::max({floor.centre.value, floor.left_edge.value, floor.right_edge.value});
}

} // namespace

// Oracle: at the end of the step the floor stands at the top of the film, to 1e-3 of what the last
// advance moved it; without the endpoint the same advance would have gone on.
// Source: definition. Tolerance: 1e-3 of the last advance; the place before it must fail.
TEST_CASE("an endpoint is met to a thousandth of its step", "[recipe]") {
    using Kind = engine::StepEnd::Kind;
    const Kind kind = GENERATE(Kind::reaches, Kind::cleared);
    TrenchCase t = until(kind, "trench", spread());
    const auto height = [&](const geometry::Surface& s) {
        return kind == Kind::reaches ? floor_of(t.c, s).centre.value : highest_floor(t.c, s);
    };
    engine::Simulation simulation(t.c);
    double before = 0, after = 0;
    while (!simulation.finished()) {
        before = height(simulation.surface());
        simulation.step(1e9);
        after = height(simulation.surface());
    }
    const double moved = before - after;
    CAPTURE(int(kind), moved, after);
    REQUIRE(moved > 1e-3);
    CHECK(std::fabs(after + film_thickness) < 1e-3 * moved);
    CHECK_FALSE(std::fabs(before + film_thickness) < 1e-3 * moved);
    CHECK(simulation.all_reached());
}

// Oracle: the mask shades the floor beside the walls, so the film is touched in the middle before
// it is gone at the foot of the walls; then no place of the floor stands above the film any more.
// Source: definition.
TEST_CASE("cleared waits for the whole floor, reaches for its centre", "[recipe]") {
    using Kind = engine::StepEnd::Kind;
    const TrenchCase touch = until(Kind::reaches, "trench", spread());
    const TrenchCase clear = until(Kind::cleared, "trench", spread());
    const auto touched = run_quietly(touch.c);
    const auto cleared = run_quietly(clear.c);
    CHECK(touched.record.steps[0].reason == "reached stop at trench centre");
    CHECK(cleared.record.steps[0].reason == "cleared down to stop over trench");
    CHECK(cleared.record.steps[0].end_s > 1.05 * touched.record.steps[0].end_s);
    CHECK(highest_floor(clear.c, cleared.last.surface) < -film_thickness + 1e-3);
    CHECK(highest_floor(touch.c, touched.last.surface) > -film_thickness + 0.5);
    CHECK(cleared.record.status == "done");
}

// Oracle: the open field gets every ion, so it ends the step at thickness / rate while the shaded
// trench is still in the film. Source: definition. Tolerance: round-off (the flat film is exact).
TEST_CASE("the open field ends a step at the flat-film rate", "[recipe]") {
    using Kind = engine::StepEnd::Kind;
    const Kind kind = GENERATE(Kind::reaches, Kind::cleared);
    const TrenchCase t = until(kind, "open field", spread());
    const auto outcome = run_quietly(t.c);
    CHECK(outcome.record.steps[0].end_s == Approx(film_thickness / open_rate).epsilon(1e-9));
    CHECK(floor_of(t.c, outcome.last.surface).centre.value > -film_thickness + 1);
    CHECK(outcome.record.status == "done");
}

// Oracle: the step lasts as long as its limit says, and the record names what was not met.
// Source: definition.
TEST_CASE("a step that runs into its limit is a result, or an error if so asked", "[recipe]") {
    using Kind = engine::StepEnd::Kind;
    const Kind kind = GENERATE(Kind::reaches, Kind::cleared);
    const std::string at = GENERATE("trench", "open field");
    TrenchCase t = until(kind, at, spread(), 5);
    t.add_step("after", 1);
    const auto may = run_quietly(t.c);
    CHECK(may.record.status == "not cleared");
    REQUIRE(may.record.steps.size() == 2); // the recipe goes on
    CHECK(may.record.steps[0].end_s == Approx(5).epsilon(1e-9));
    CHECK(may.record.steps[0].reason.find(kind == Kind::cleared ? "did not clear down to stop over"
                                                                : "did not reach stop at") == 0);
    CHECK(may.record.steps[0].reason.find("within 5 s") != std::string::npos);
    CHECK(!may.error);

    t.c.steps[0].must_end = true;
    const auto must = run_quietly(t.c);
    CHECK(must.record.status == "failed");
    CHECK(must.record.steps.size() == 1);
    CHECK(must.record.failure == "step main: " + may.record.steps[0].reason);
    REQUIRE(must.error);
    CHECK_THROWS_AS(std::rethrow_exception(must.error), NumericsError);
    CHECK(must.last.time_s == Approx(5).epsilon(1e-9)); // what was etched is kept
}

// Oracle: the overetch is the stated share of the time that the named step took, whichever step
// stands between. Source: definition. Tolerance: round-off of the sums of times.
TEST_CASE("overetch is a share of the time that a step took", "[recipe]") {
    TrenchCase t = until(engine::StepEnd::Kind::reaches, "trench", spread());
    t.add_step("breath", 0.5);
    t.add_step("over", 0);
    t.c.steps[2].end.kind = engine::StepEnd::Kind::share_of_step;
    t.c.steps[2].end.share = 0.3;
    t.c.steps[2].end.of_step = "main";
    const auto outcome = run_quietly(t.c);
    const auto& steps = outcome.record.steps;
    REQUIRE(steps.size() == 3);
    const auto lasted = [&](int i) { return steps[i].end_s - steps[i].start_s; };
    CHECK(lasted(2) == Approx(0.3 * lasted(0)).epsilon(1e-9));
    CHECK(lasted(2) != Approx(0.3 * lasted(1)).epsilon(1e-3));
    CHECK(steps[2].start_s == steps[1].end_s);
    CHECK(outcome.record.simulated_s == Approx(steps[2].end_s).epsilon(1e-12));
}
