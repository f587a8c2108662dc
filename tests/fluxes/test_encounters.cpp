// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/encounters.hpp"
#include "tests/support/pulls.hpp"
#include "tests/support/sheath_cases.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

using Kind = CollisionProcess::Kind;

Sheath any_sheath() {
    Sheath sheath;
    sheath.voltage = Waveform::steady(100);
    sheath.thickness_nm = 1e6;
    return sheath;
}

Encounters meeting(Kind kind, double gas_mass, double gas_k) {
    SheathIon ion = argon_ion(0, gas_k);
    ion.collisions = {constant_process(kind, "gas", gas_mass, 1, 1e-6)};
    const SheathField field(any_sheath(), ion.mass_amu);
    return Encounters(ion, field);
}

/// Pulls of sin^2 of the angle behind an elastic collision, uniform for equal masses.
rille::tests::Pulls angle_pulls(double gas_mass) {
    const Encounters encounters = meeting(Kind::isotropic, gas_mass, 0);
    const int tries = 100000, bins = 64;
    std::vector<double> hits(bins, 0.0);
    for (int i = 0; i < tries; ++i) {
        Draws draws(stream_key(3, i), 0); // independent, so that the counts are binomial
        const auto out = encounters.meet({1.2, 0}, 0.5, draws);
        const double sine2 = out.ion.across * out.ion.across / out.ion.squared();
        hits[std::min(bins - 1, int(bins * sine2))] += 1;
    }
    return binomial_pulls(hits, std::vector<double>(bins, 1.0 / bins), tries);
}

} // namespace

TEST_CASE("elastic collisions of equal masses", "[sheath]") {
    // Oracle: angle of the ion behind a target at rest: sin^2 uniform on 0 to 1, energy kept
    // cos^2. Source: derived here. Tolerance: the pulls of independent counts; a mass 2 % off must
    // fail; energies 1e-12.
    const auto good = angle_pulls(39.948);
    CAPTURE(good.chi2_per_bin, good.largest, good.mean);
    CHECK(good.pass());
    CHECK_FALSE(angle_pulls(39.948 * 1.02).pass());
    const Encounters encounters = meeting(Kind::isotropic, 39.948, 0);
    for (std::uint32_t i = 0; i < 100; ++i) {
        Draws draws(9, i);
        const auto out = encounters.meet({1.2, 0}, 0.5, draws);
        const double cosine2 = out.ion.along * out.ion.along / out.ion.squared();
        CHECK(out.ion.squared() == Approx(1.44 * cosine2).epsilon(1e-12));
        CHECK(out.ion.along >= -1e-12);
    }
}

TEST_CASE("elastic collisions of any masses conserve energy", "[sheath]") {
    // Oracle: energy of ion and target before and after; mean energy passed on to a target at
    // rest, 2 m M / (m + M)^2. Source: mechanics. Tolerance: 1e-12; 4 standard errors.
    for (const double gas : {4.0026, 39.948, 131.293})
        for (const double gas_k : {0.0, 300.0}) {
            const Encounters encounters = meeting(Kind::isotropic, gas, gas_k);
            double passed = 0;
            const int tries = 20000;
            for (std::uint32_t i = 0; i < tries; ++i) {
                Draws draws(11, i);
                const auto out = encounters.meet({0.3, 0.2}, 0.5, draws);
                CHECK_FALSE(out.exchange);
                const double in = 100 * 0.13 + out.thermal_ev;
                if (i < 200)
                    CHECK(100 * out.ion.squared() + out.recoil_ev == Approx(in).epsilon(1e-12));
                passed += out.recoil_ev / 13 / tries;
            }
            if (gas_k > 0) continue;
            const double m = 39.948 / (39.948 + gas), expected = 2 * m * (1 - m);
            CHECK(passed == Approx(expected).margin(4 * expected / std::sqrt(3.0 * tries)));
        }
}

TEST_CASE("charge exchange leaves a thermal ion", "[sheath]") {
    // Oracle: mean thermal energy 3/2 kT, a third of it along the normal, no preferred sense.
    // Source: Maxwell's distribution. Tolerance: 4 standard errors of independent draws.
    const Encounters encounters = meeting(Kind::charge_exchange, 39.948, 400);
    const double kt = 8.617333262e-5 * 400;
    const int tries = 20000;
    double sum = 0, along = 0, sense = 0;
    for (int i = 0; i < tries; ++i) {
        Draws draws(stream_key(21, i), 0);
        const auto out = encounters.meet({1, 0.1}, 0.5, draws);
        CHECK(out.exchange);
        CHECK(out.thermal_ev == Approx(100 * out.ion.squared()).epsilon(1e-9));
        sum += out.thermal_ev / tries;
        along += 100 * out.ion.along * out.ion.along / tries;
        sense += (out.ion.along > 0 ? 1.0 : -1.0) / tries;
    }
    const double root = std::sqrt(double(tries));
    CHECK(sum == Approx(1.5 * kt).margin(4 * std::sqrt(1.5) * kt / root));
    CHECK(along == Approx(0.5 * kt).margin(4 * std::sqrt(0.5) * kt / root));
    CHECK(std::fabs(sense) < 4 / root);
}
