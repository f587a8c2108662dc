// SPDX-License-Identifier: Apache-2.0
#include "fluxes/causes.hpp"
#include "fluxes/mechanism.hpp"
#include "fluxes/surface_chemistry.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <random>
#include <vector>

using namespace rille::fluxes;

namespace {

/// Metal (material 0, 80 a nm^3) and oxide (1, 22 a nm^3), both sputtered; either sticks on the
/// other. Tally 0: metal atoms from metal, 1: oxide units from oxide.
Mechanism milling(double sticks_metal, double sticks_oxide) {
    Mechanism m;
    m.ions = {"Ar+"};
    m.neutrals = {"metal", "oxide"};
    m.cosine_power = {1, 1};
    m.tallies.resize(2);
    const SurfacePart whole{};
    const Leavings metal{{0, 1}}, oxide{{1, 1}};
    m.surfaces.resize(2);
    m.surfaces[0] = {"metal",
                     80,
                     {"redeposited oxide"},
                     {PhysicalSputtering{whole, {0}, metal},
                      Deposition{0, -1, sticks_metal, 80, 0, {}},
                      Redeposition{1, 0, sticks_oxide, 22, 1, {{{1}, oxide}}}}};
    m.surfaces[1] = {"oxide",
                     22,
                     {"redeposited metal"},
                     {PhysicalSputtering{whole, {1}, oxide},
                      Deposition{1, -1, sticks_oxide, 22, 1, {}},
                      Redeposition{0, 0, sticks_metal, 80, 0, {{{0}, metal}}}}};
    return m;
}

SurfaceResponse answer(const Mechanism& m, int material, std::vector<double> tallies,
                       std::vector<double> neutrals) {
    return respond(m, material, {tallies.data(), neutrals.data(), 300});
}

} // namespace

TEST_CASE("processes give off what they remove", "[by_products]") {
    // Oracle: units removed times amount a unit: rate times density where nothing returns.
    // Source: balance of atoms, derived here.
    // Tolerance: 1e-12 relative; half the amount must be seen.
    Mechanism m;
    m.ions = {"Ar+"};
    m.neutrals = {"F", "SiF2"};
    m.cosine_power = {0, 1};
    m.tallies.resize(1);
    m.surfaces.resize(1);
    SurfaceChemistry& s = m.surfaces[0];
    s.density = 50;
    s.coverages = {"F"};
    for (const double amount : {1.0, 0.5}) {
        const Leavings leaves{{1, amount}};
        s.processes = {Adsorption{0, 0, 0.5, 1, {}}, IonEnhancedEtching{0, 2, {0}, leaves},
                       PhysicalSputtering{{SurfacePart::Kind::bare, -1}, {0}, leaves},
                       SpontaneousEtching{0, {0.1}, 4, {}, leaves},
                       ThermalEtching{0, {3}, 2, leaves}};
        const SurfaceResponse r = answer(m, 0, {20}, {100, 7});
        CHECK(r.by_ion_enhanced > 0);
        CHECK(r.by_sputtering > 0);
        CHECK(r.by_spontaneous > 0);
        CHECK(r.emitted[1] == Approx(amount * r.rate * 50).epsilon(1e-12));
        CHECK(r.emitted[0] == 0);
    }
}

TEST_CASE("redeposits take the place of what lies below, or grow", "[by_products]") {
    // Oracle: a quarter of what ions could take of the film arrives: a quarter is covered, and as
    // much of the film leaves as arrives; twice as much arrives: growth by the other half.
    // Source: balance of atoms, derived here. Tolerance: 1e-12.
    const Mechanism m = milling(0.5, 1);
    const SurfaceResponse some = answer(m, 1, {10, 4}, {5, 0});
    CHECK(some.coverage[0] == Approx(0.25));
    CHECK(some.sticking[0] == 0.5);
    CHECK(some.rate == Approx(0.75 * 4 / 22));
    CHECK(some.emitted[0] == Approx(2.5));
    CHECK(some.emitted[1] == Approx(3));
    CHECK(some.grown_material == -1);
    const SurfaceResponse more = answer(m, 1, {10, 4}, {40, 0});
    CHECK(more.coverage[0] == Approx(1));
    CHECK(more.sticking[0] == 0.5);
    CHECK(more.rate == Approx(-10.0 / 80));
    CHECK(more.emitted[0] == Approx(10));
    CHECK(more.emitted[1] == 0);
    CHECK(more.grown_material == 0);
    // The target takes its own atoms back: removal less return.
    const SurfaceResponse own = answer(m, 0, {10, 4}, {5, 0});
    CHECK(own.rate == Approx((10 - 2.5) / 80));
    CHECK(own.by_deposition == Approx(-2.5 / 80));
    CHECK(own.emitted[0] == Approx(10));
    CHECK(answer(m, 0, {10, 4}, {50, 0}).grown_material == 0);
    // In the dark everything that sticks stays, both materials in proportion.
    const SurfaceResponse dark = answer(m, 1, {0, 0}, {8, 2});
    CHECK(dark.rate == Approx(-(4.0 / 80 + 2.0 / 22)));
    CHECK(dark.grown_material == 1);
    CHECK(answer(m, 1, {0, 0}, {80, 0.1}).grown_material == 0);
    // Nothing sticks: nothing comes back.
    const SurfaceResponse none = answer(milling(0, 1), 1, {10, 4}, {40, 0});
    CHECK(none.rate == Approx(4.0 / 22));
    CHECK(none.emitted[0] == 0);
}

TEST_CASE("atoms are balanced at any surface", "[by_products]") {
    // Oracle: of every species, what sticks less what leaves is what the surface gains of it; here
    // the volume: sum of (sticking x arriving - emitted) / density = -rate. Causes add up to the
    // rate. Small changes of arrivals change rates little.
    // Source: balance of atoms, derived here. Arrivals over eight decades.
    // Tolerance: 1e-10 of the sum of the sizes; 2 % of one emission must be seen.
    Mechanism m = milling(0.7, 0.9);
    m.surfaces.push_back({"tungsten",
                          63,
                          {"redeposited metal", "redeposited oxide"},
                          {Redeposition{0, 0, 0.7, 80, 0, {{{0}, {{0, 1}}}}},
                           Redeposition{1, 1, 0.9, 22, 1, {{{1}, {{1, 1}}}}}}});
    std::mt19937_64 random(3);
    std::uniform_real_distribution<double> decade(-4, 4), unit(0, 1);
    const auto draw = [&] { return unit(random) < 0.15 ? 0.0 : std::pow(10, decade(random)); };
    int misses = 0, seen = 0, jumps = 0, grown = 0, held = 0;
    double worst = 0;
    for (int trial = 0; trial < 20000; ++trial) {
        const int material = trial % 3;
        std::vector<double> tallies{draw(), draw()}, neutrals{draw(), draw()};
        const SurfaceResponse r = answer(m, material, tallies, neutrals);
        double gain = 0, size = 0;
        const double density[] = {80, 22};
        for (int k = 0; k < 2; ++k) {
            gain += (r.sticking[k] * neutrals[k] - r.emitted[k]) / density[k];
            size += (r.sticking[k] * neutrals[k] + r.emitted[k]) / density[k];
        }
        worst = std::max(worst, std::fabs(gain + r.rate) / std::max(size, 1e-300));
        misses += std::fabs(gain + r.rate) > 1e-10 * size;
        seen += std::fabs(gain - 0.02 * r.emitted[0] / 80 + r.rate) > 1e-10 * size;
        grown += r.rate < 0;
        held += (r.grown_material >= 0) == (r.rate < 0);
        const CauseRates causes =
            cause_rates(m, material, r,
                        std::vector<double>{tallies[0], tallies[1], 0, 0, 0, 0, 0, 0, 0, 0}.data());
        double sum = 0;
        for (const double c : causes)
            sum += c;
        misses += std::fabs(sum - r.rate) > 1e-10 * size;
        for (double& n : neutrals)
            n *= 1 + 1e-7;
        jumps += std::fabs(answer(m, material, tallies, neutrals).rate - r.rate) > 1e-5 * size;
    }
    INFO("worst " << worst << ", grown " << grown);
    CHECK(misses == 0);
    CHECK(jumps == 0);
    CHECK(held == 20000);
    CHECK(seen > 5000);
    CHECK(grown > 3000);
}
