// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath_arrival.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

Sheath sheath_at(const Waveform& voltage) {
    return make_sheath(3, 6.065e-11, voltage, HUGE_VAL).sheath;
}
SheathIon argon_at(double pressure_pa) {
    SheathIon ion;
    ion.name = "Ar+";
    ion.mass_amu = 39.948;
    if (pressure_pa > 0) ion.collisions = argon_in_argon(gas_density(pressure_pa, 300));
    return ion;
}
const Waveform steady = Waveform::steady(200);
const Waveform swinging = Waveform::sum_of({{13.56e6, 150, 0}}).raised_by(200);
constexpr double mtorr = 0.13332237; // [Pa]

} // namespace

// Oracle: the closed form knows few collisions: it serves below a tenth of the mean free path, and
// is refused beyond. Source: definition. Tolerance: none.
TEST_CASE("collisions decide about the way through a sheath", "[sheath][arrival]") {
    CHECK(way_through(sheath_at(steady), argon_at(mtorr)) == SheathWay::free_fall);
    CHECK(way_through(sheath_at(swinging), argon_at(0)) == SheathWay::closed_form);
    CHECK(way_through(sheath_at(swinging), argon_at(5 * mtorr)) == SheathWay::closed_form);
    CHECK(way_through(sheath_at(swinging), argon_at(20 * mtorr)) == SheathWay::trajectories);
    CHECK(way_through(sheath_at(steady), argon_at(20 * mtorr)) == SheathWay::trajectories);
    Sheath moving = sheath_at(swinging);
    moving.edge = SheathEdge::moving;
    CHECK(way_through(moving, argon_at(0)) == SheathWay::trajectories);
}

// Oracle: both ways end: a wafer above its plasma, and ions that drift, beyond a hundred mean free
// paths.
// Source: definition. Tolerance: none.
TEST_CASE("where no way holds the sheath is refused in words", "[sheath][arrival]") {
    const TrajectorySampling few{1000, 1};
    Sheath above = sheath_at(swinging);
    above.voltage = Waveform::sum_of({{13.56e6, 150, 0}}).raised_by(100);
    CHECK_THROWS_WITH(arrive(above, argon_at(0), few),
                      "the wafer would lie above the plasma for part of the period");
    CHECK_THROWS_WITH(arrive(sheath_at(steady), argon_at(2e3), few), Catch::Contains("they drift"));
    CHECK_NOTHROW(arrive(sheath_at(steady), argon_at(20 * mtorr), few));
}

// Oracle: the same sampling gives the same numbers whether bins are kept in between or not.
// Source: definition. Tolerance: none.
TEST_CASE("binned trajectories are the arrival itself", "[sheath][arrival]") {
    const TrajectorySampling sampling{4000, 3};
    const Sheath sheath = sheath_at(steady);
    const SheathIon ion = argon_at(30 * mtorr);
    const SheathArrival direct = arrive(sheath, ion, sampling);
    const SheathArrival binned = arrival_of(follow_into_bins(sheath, ion, sampling));
    std::vector<double> a, b;
    direct.ions.front().append_content(a);
    binned.ions.front().append_content(b);
    CHECK(a == b);
    CHECK(direct.fast_neutrals_per_ion == binned.fast_neutrals_per_ion);
    CHECK(direct.fast_neutrals_per_ion > 0.1);
    std::vector<double> other = content_of(sheath, ion, sampling);
    CHECK(other == content_of(sheath, ion, sampling));
    CHECK(other != content_of(sheath, ion, {4000, 4}));
    CHECK(other != content_of(sheath, argon_at(31 * mtorr), sampling));
}
