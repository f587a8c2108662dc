// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();
const double edge = std::exp(-0.5) * 1e-10; ///< nm^-3, bulk 1e17 m^-3

bool has(const SheathThickness& t, SheathNote::Kind kind) {
    return std::any_of(t.notes.begin(), t.notes.end(),
                       [&](const SheathNote& n) { return n.kind == kind; });
}

} // namespace

TEST_CASE("which thickness holds, and why", "[sheath][thickness]") {
    // Oracle: collisional thickness below Child's where the mean free path is below 0.3016 of it:
    // at
    //         20 and 100 V with 0.3 mm Child's, at 300 and 1000 V the collisional one; with 3 mm
    //         Child's everywhere.
    // Source: Child (1911), Langmuir (1913); collisional law from memory; values derived here.
    // Tolerance: 1e-4 (printed digits).
    struct Row {
        double volt, nm;
        SheathLaw law;
    };
    const Row rows[] = {{20, 1.7197e5, SheathLaw::child},
                        {100, 5.7501e5, SheathLaw::child},
                        {300, 1.2404e6, SheathLaw::collisional},
                        {1000, 2.5544e6, SheathLaw::collisional}};
    for (const Row& row : rows) {
        const auto fine = make_sheath(3, edge, Waveform::steady(row.volt), 0.3e6);
        CHECK(fine.thickness.law == row.law);
        CHECK(fine.thickness.nm == Approx(row.nm).epsilon(1e-4));
        CHECK(fine.sheath.thickness_nm == fine.thickness.nm);
        CHECK(fine.sheath.profile_power == Approx(row.law == SheathLaw::child ? 4 / 3. : 5 / 3.));
        for (double path : {3e6, infinite})
            CHECK(make_sheath(3, edge, Waveform::steady(row.volt), path).thickness.law ==
                  SheathLaw::child);
    }
    const auto moving =
        make_sheath(3, edge, Waveform::steady(100), infinite, 300, SheathEdge::moving);
    CHECK(moving.sheath.thickness_nm == Approx(4.2688e5).epsilon(1e-4));
}

TEST_CASE("a sheath says where it leaves its range", "[sheath][thickness]") {
    // Oracle: Child's field is 31.6 % too large at 10 Te, 7.8 % at 100 Te; a mean free path between
    //         0.3 and 1 of the thickness lies between the laws; a drift slower than the gas.
    // Source: first integral of the planar sheath equation; derived here. Tolerance: 1e-4.
    using Kind = SheathNote::Kind;
    const auto weak = make_sheath(3, edge, Waveform::steady(30), infinite).thickness;
    REQUIRE(has(weak, Kind::weak_field));
    CHECK(weak.notes[0].value == Approx(0.31591).epsilon(1e-4));
    CHECK(in_words(weak.notes[0]).find("31.6 %") != std::string::npos);
    CHECK_FALSE(
        has(make_sheath(3, edge, Waveform::steady(300), infinite).thickness, Kind::weak_field));
    CHECK(has(make_sheath(3, edge, Waveform::steady(1000), 1e6).thickness, Kind::between_regimes));
    CHECK_FALSE(
        has(make_sheath(3, edge, Waveform::steady(1000), 1e7).thickness, Kind::between_regimes));
    CHECK(has(make_sheath(3, edge, Waveform::steady(20), 20).thickness, Kind::slow_drift));
    const auto dip = Waveform::sum_of({{2e6, 100, 0}}).raised_by(99);
    CHECK(has(make_sheath(3, edge, dip, infinite).thickness, Kind::not_positive));
    CHECK_FALSE(
        has(make_sheath(3, edge, dip.raised_by(2), infinite).thickness, Kind::not_positive));
    CHECK_THROWS_AS(make_sheath(3, -edge, Waveform::steady(30), infinite), std::invalid_argument);
    CHECK_THROWS_AS(make_sheath(3, edge, Waveform::steady(-30), infinite), std::invalid_argument);
    CHECK_THROWS_AS(make_sheath(3, edge, Waveform::steady(30), 0), std::invalid_argument);
    CHECK_THROWS_AS(make_sheath(0, edge, Waveform::steady(30), 1e6), std::invalid_argument);
}

TEST_CASE("transit times and collisions of a sheath", "[sheath]") {
    // Oracle: thickness 0.96706 mm at 200 V; transit 14.821, 93.338, 124.35, 166.46 ns for H+, Ar+,
    //         Cl2+, SF5+; collisionality 0.0558 to 1.1154 for argon at 5 to 100 mTorr, and charge
    //         exchange alone.
    // Source: Child's law, derived here; cross sections of Phelps (1994). Tolerance: 1e-4; 2 % on
    //         collisions (printed for charge exchange, isotropic scattering added here).
    const auto made = make_sheath(3, edge, Waveform::steady(200), infinite);
    CHECK(made.thickness.nm == Approx(0.96706e6).epsilon(1e-4));
    const double rows[4][2] = {
        {1.00728, 14.821}, {39.948, 93.338}, {70.906, 124.35}, {127.052, 166.46}};
    for (const auto& row : rows)
        CHECK(transit_time_s(made.sheath, row[0]) * 1e9 == Approx(row[1]).epsilon(1e-4));
    const double pressures[3][2] = {{5, 0.0558}, {20, 0.2231}, {100, 1.1154}};
    for (const auto& row : pressures) {
        SheathIon argon;
        argon.name = "Ar+";
        argon.mass_amu = 39.948;
        argon.collisions = {constant_process(CollisionProcess::Kind::charge_exchange, "Ar", 39.948,
                                             gas_density(0.13332237 * row[0], 300), 0.358329)};
        CHECK(collisionality(made.sheath, argon) == Approx(row[1]).epsilon(1e-3));
        const double exchange_only = collisionality(made.sheath, argon);
        argon.collisions = argon_in_argon(gas_density(0.13332237 * row[0], 300));
        CHECK(collisionality(made.sheath, argon) == Approx(exchange_only).epsilon(0.1));
    }
    CHECK(std::isinf(mean_free_path_nm({"Ar+", 39.948, 0.1, 300, {}}, 100)));
    CHECK(collisionality(made.sheath, {"Ar+", 39.948, 0.1, 300, {}}) == 0);
}
