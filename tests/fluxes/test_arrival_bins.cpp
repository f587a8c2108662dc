// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/sampling.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/sheath_cases.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <stdexcept>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

/// Figures of a distribution by an even set of its samples.
EnergyFigures figures_of(const IonDistribution& ions) {
    const ScrambledPoints points(5);
    std::vector<Arrival> samples;
    for (std::uint32_t i = 0; i < 1u << 16; ++i)
        samples.push_back({ions.sample(points.four(i)).energy_ev, 0, 0});
    return energy_figures(samples);
}

void check_round_trip(const std::vector<Arrival>& arrivals) {
    const IonDistribution ions = distribution_of(arrivals);
    const EnergyFigures before = energy_figures(arrivals), after = figures_of(ions);
    CAPTURE(before.mean, before.deviation, after.mean, after.deviation);
    CHECK(ions.mean_energy_ev() == Approx(before.mean).epsilon(1e-3));
    CHECK(after.deviation == Approx(before.deviation).epsilon(1e-2).margin(1e-5 * before.mean));
    for (const double share : {0.1, 0.5, 0.9, 0.99}) {
        const double angle = angle_quantile_deg(arrivals, share);
        CAPTURE(share, angle);
        if (share == 0.5) CHECK(ions.median_angle_deg() == Approx(angle).epsilon(0.02));
        CHECK(ions.share_within_deg(angle) == Approx(share).margin(0.01));
    }
}

} // namespace

TEST_CASE("arrivals as a distribution keep their figures", "[sheath]") {
    // Oracle: mean and deviation of the energies, quantiles of the angle. Source: the arrivals
    // themselves. Tolerance: mean 0.1 %, deviation 1 %, median angle 2 %, shares 0.01.
    const int ions = 50000;
    SECTION("two narrow peaks") {
        check_round_trip(
            follow_ions(swinging_sheath(4 / 3., 0.1, 30, 39.948), argon_ion(0.03), {ions, 1}).ions);
    }
    SECTION("a wide saddle") {
        check_round_trip(
            follow_ions(swinging_sheath(4 / 3., 0.95, 0.5, 39.948), argon_ion(0.5), {ions, 1})
                .ions);
    }
    SECTION("one energy") {
        Sheath sheath = swinging_sheath(4 / 3., 0.1, 30, 39.948);
        sheath.voltage = Waveform::steady(5000);
        check_round_trip(follow_ions(sheath, argon_ion(0.05), {ions, 1}).ions);
    }
    SECTION("a beam with a wide tail, and its fast neutrals") {
        SheathIon ion = argon_ion(0.1);
        for (const double mtorr : {10, 300}) {
            ion.collisions = argon_in_argon(gas_density(mtorr));
            const Arrivals r = follow_ions(swinging_sheath(4 / 3., 0.9, 3, 39.948), ion, {ions, 1});
            check_round_trip(r.ions);
            check_round_trip(r.fast_neutrals);
        }
    }
}

TEST_CASE("arrivals that cannot be are refused", "[sheath]") {
    CHECK_THROWS_AS(distribution_of({}), std::invalid_argument);
    const double nan = std::numeric_limits<double>::quiet_NaN();
    CHECK_THROWS_AS(distribution_of({{nan, 0, 0}}), std::invalid_argument);
    CHECK_THROWS_AS(distribution_of({{1, nan, 0}}), std::invalid_argument);
    CHECK_THROWS_AS(distribution_of({{-1, 0, 0}}), std::invalid_argument);
    // Every arrival alike is a beam; no energy at all is still a distribution.
    CHECK(distribution_of({{300, 0, 0}, {300, 0, 0}}).mean_energy_ev() ==
          Approx(300).epsilon(1e-5));
    CHECK(distribution_of({{0, 0, 0}}).mean_energy_ev() < 1e-6);
}
