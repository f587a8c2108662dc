// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plasma_laws.hpp"
#include "fluxes/plasma_state.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

PlasmaMix argon_chlorine() {
    PlasmaMix mix;
    mix.ions = {{"Ar+", 39.948, 2}, {"Cl2+", 70.906, 1}, {"Cl+", 35.453, 1}};
    return mix;
}

} // namespace

TEST_CASE("plasma state of argon", "[plasma]") {
    // Oracle: flux 1.6327e20 m^-2 s^-1, drop 14.0368 V, plasma potential 15.5368 V for Te = 3 eV
    // and
    //         1e17 m^-3.
    // Source: derived here. Tolerance: 1e-4; the way back from the flux 1e-12.
    PlasmaMix mix;
    mix.ions = {{"Ar+", 39.948, 1}};
    const PlasmaState state = state_from_bulk_density(mix, 1e17 * 1e-27);
    CHECK(state.ion_flux * 1e18 == Approx(1.6327e20).epsilon(1e-4));
    CHECK(state.floating_drop_v == Approx(14.0368).epsilon(1e-4));
    CHECK(state.plasma_potential_v == Approx(15.5368).epsilon(1e-4));
    CHECK(state.presheath_drop_v == Approx(1.5).epsilon(1e-12));
    CHECK(state.edge_electrons * 1e27 == Approx(6.06531e16).epsilon(1e-5));
    CHECK(state.debye_length_nm == Approx(5.22821e4).epsilon(1e-5));
    CHECK(state.ions[0].edge_density == Approx(state.edge_electrons).epsilon(1e-12));
    const PlasmaState back = state_from_flux(mix, state.ion_flux);
    CHECK(back.bulk_electrons == Approx(1e-10).epsilon(1e-12));
    CHECK(back.plasma_potential_v == Approx(state.plasma_potential_v).epsilon(1e-12));
}

TEST_CASE("plasma state of several ions", "[plasma]") {
    // Oracle: shares are of the flux; the edge is neutral; electrons and ions balance at the
    //         floating wall; one speed for all gives shares of the density.
    // Source: quasi-neutrality and flux balance, derived here. Tolerance: 1e-12.
    for (bool common : {false, true}) {
        PlasmaMix mix = argon_chlorine();
        mix.common_sound_speed = common;
        const PlasmaState state = state_from_flux(mix, 100);
        double flux = 0, density = 0, squares = 0;
        for (const PlasmaState::Ion& ion : state.ions) {
            flux += ion.flux;
            density += ion.edge_density;
            squares += ion.edge_density * std::pow(bohm_speed(3, ion.mass_amu), 2);
            CHECK(ion.flux == Approx(ion.edge_density * ion.edge_speed).epsilon(1e-12));
        }
        CHECK(state.ions[0].flux == Approx(50).epsilon(1e-12));
        CHECK(flux == Approx(100).epsilon(1e-12));
        CHECK(density == Approx(state.edge_electrons).epsilon(1e-12));
        CHECK(state.electron_flux * std::exp(-state.floating_drop_v / 3) ==
              Approx(100).epsilon(1e-12));
        if (common)
            CHECK(state.ions[0].edge_speed == Approx(std::sqrt(squares / density)).epsilon(1e-12));
        else
            CHECK(state.ions[1].edge_speed == Approx(bohm_speed(3, 70.906)).epsilon(1e-12));
        const PlasmaState back = state_from_bulk_density(mix, state.bulk_electrons);
        CHECK(back.ion_flux == Approx(100).epsilon(1e-12));
    }
}

TEST_CASE("negative ions slow the positive ones and lower the potential", "[plasma]") {
    // Oracle: edge speed times 0.25400 for as many negative ions as electrons at thirty times their
    //         temperature; the positive ions balance both.
    // Source: Boyd & Thompson (1959); Braithwaite & Allen (1988), from memory. Tolerance: 1e-4.
    PlasmaMix mix = argon_chlorine();
    const PlasmaState without = state_from_bulk_density(mix, 1e-10);
    mix.negative_ions = 1;
    mix.negative_temperature_ratio = 30;
    const PlasmaState with = state_from_bulk_density(mix, 1e-10);
    CHECK(with.ions[0].edge_speed / without.ions[0].edge_speed == Approx(0.25400).epsilon(1e-4));
    CHECK(with.ion_flux / without.ion_flux == Approx(2 * 0.25400).epsilon(1e-4));
    double density = 0;
    for (const PlasmaState::Ion& ion : with.ions)
        density += ion.edge_density;
    CHECK(density == Approx(2 * with.edge_electrons).epsilon(1e-12));
    const PlasmaState back = state_from_flux(mix, with.ion_flux);
    CHECK(back.edge_electrons == Approx(with.edge_electrons).epsilon(1e-12));
}

TEST_CASE("plasma states refuse what cannot be", "[plasma]") {
    PlasmaMix mix = argon_chlorine();
    const double nan = std::numeric_limits<double>::quiet_NaN();
    CHECK_THROWS_AS(state_from_flux(mix, -1), std::invalid_argument);
    CHECK_THROWS_AS(state_from_bulk_density(mix, -1), std::invalid_argument);
    CHECK_THROWS_AS(state_from_bulk_density(mix, nan), std::invalid_argument);
    mix.edge_over_bulk = 1.5;
    CHECK_THROWS_AS(state_from_flux(mix, 1), std::invalid_argument);
    mix = argon_chlorine();
    mix.ions[0].flux_share = -1;
    CHECK_THROWS_AS(state_from_flux(mix, 1), std::invalid_argument);
    mix = argon_chlorine();
    mix.electron_temperature_ev = 0;
    CHECK_THROWS_AS(state_from_flux(mix, 1), std::invalid_argument);
    mix.ions.clear();
    CHECK_THROWS_AS(state_from_flux(mix, 1), std::invalid_argument);
}
