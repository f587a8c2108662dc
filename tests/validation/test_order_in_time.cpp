// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::tests;

// Oracle: the floor rate of a trench falls with its depth as its ions are shadowed; halving the
// time between refreshes divides the change of the depth by 2^order.
// Source: Heun's method has order 2. Tolerance: order 1.8. The difference at the finest pair is
// about a thousandth of a cell, little above what a refresh of the front leaves by itself; with
// weaker coupling or more refreshes that remainder, of first order, shows instead.
TEST_CASE("the coupling of arrivals and front is of second order in time", "[validation][order]") {
    const double duration = 20;
    double depth[3];
    for (int level = 0; level < 3; ++level) {
        TrenchCase t(80, 1, 30, 2000);
        t.add_opening("trench", 40);
        t.set_ions(50, fluxes::IonDistribution::gaussian(100, 0.3));
        etch_by_ions(t, 0, flat_yield(1));
        t.add_step("main", duration);
        t.c.refresh_move = 20; // the times of refreshes are set below
        engine::Simulation simulation(t.c);
        for (int n = 1; !simulation.finished(); ++n)
            simulation.step(n * duration / (6 << level));
        const auto floor =
            geometry::floor_of(t.c.domain, simulation.surface(), engine::feature_sites(t.c)[0]);
        REQUIRE(floor);
        depth[level] = -floor->centre.value;
    }
    const double order = std::log2((depth[1] - depth[0]) / (depth[2] - depth[1]));
    WARN("depths " << depth[0] << ", " << depth[1] << ", " << depth[2] << ": order " << order);
    CHECK(depth[2] < 0.95 * duration); // the rate does fall
    CHECK(order > 1.8);
}
