// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <array>
#include <cmath>

using namespace rille;
using namespace rille::tests;

namespace {

struct Coupling {
    double sigma;  ///< slope spread of the ions
    double mask;   ///< thickness [nm]
    double offset; ///< largest deviation of a difference from Heun's own [nm]
};

constexpr double width = 40, duration = 20;
constexpr std::array<int, 3> steps{6, 12, 24};

/// Depths of the floor's centre with this many refreshes, each of the same length.
std::array<double, 3> run(const Coupling& c) {
    std::array<double, 3> depth{};
    for (int level = 0; level < 3; ++level) {
        TrenchCase t(80, 1, c.mask, 2000);
        t.add_opening("trench", width);
        t.set_ions(50, fluxes::IonDistribution::gaussian(100, c.sigma));
        etch_by_ions(t, 0, flat_yield(1));
        t.add_step("main", duration);
        t.c.refresh_move = 20; // the times of refreshes are set below
        t.c.refresh_change = 1;
        engine::Simulation simulation(t.c);
        for (int n = 1; !simulation.finished(); ++n)
            simulation.step(n * duration / steps[level]);
        const auto floor =
            geometry::floor_of(t.c.domain, simulation.surface(), engine::feature_sites(t.c)[0]);
        REQUIRE(floor);
        depth[level] = -floor->centre.value;
    }
    return depth;
}

/// The floor's centre sees the sky between two fixed lips: its depth is an ordinary differential
/// equation. Heun's method (order 2) or Euler's (order 1) with the same steps.
std::array<double, 3> scalar(const Coupling& c, bool second_order) {
    const auto rate = [&](double depth) {
        return std::erf(0.5 * width / (std::sqrt(2.0) * c.sigma * (c.mask + depth)));
    };
    std::array<double, 3> depth{};
    for (int level = 0; level < 3; ++level) {
        const double dt = duration / steps[level];
        double& z = depth[level];
        for (int i = 0; i < steps[level]; ++i) {
            const double k = rate(z);
            z += second_order ? 0.5 * dt * (k + rate(z + dt * k)) : dt * k;
        }
    }
    return depth;
}

} // namespace

// Oracle: the floor rate of a trench falls with its depth as its ions are shadowed; halving the
// time between refreshes changes the depth as it does for Heun's method on the same differential
// equation, so by a quarter as much each time.
// Source: Heun's method has order 2; the equation is derived here.
// Tolerance: order 1.8 where the coupling is strong. The differences between step counts follow
// Heun's own within 0.0004 nm (cells); Euler's are a hundred times that. What is left is no error
// in time: the error of the grid (0.02 to 0.06 cell here, falling as the square of the cell)
// depends by half a per cent on where in its cells the floor lies when its arrivals are gathered.
// Where the coupling is weak the differences are as small as that, so their ratio says nothing.
TEST_CASE("the coupling of arrivals and front is of second order in time", "[validation][order]") {
    for (const Coupling& c : {Coupling{0.3, 30, 4e-4}, Coupling{0.1, 80, 4e-4}}) {
        const auto depth = run(c), heun = scalar(c, true), euler = scalar(c, false);
        const double order = std::log2((depth[1] - depth[0]) / (depth[2] - depth[1]));
        WARN("spread " << c.sigma << ": depths " << depth[0] << ", " << depth[1] << ", " << depth[2]
                       << ": order " << order);
        if (c.sigma > 0.2) {
            CHECK(depth[2] < 0.95 * duration); // the rate does fall
            CHECK(order > 1.8);
        }
        for (int level = 1; level < 3; ++level) {
            const double change = depth[level] - depth[level - 1];
            CHECK(std::fabs(change - (heun[level] - heun[level - 1])) < c.offset);
            CHECK(std::fabs(change - (euler[level] - euler[level - 1])) > 10 * c.offset);
        }
    }
}
