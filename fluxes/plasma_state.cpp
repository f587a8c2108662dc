// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plasma_state.hpp"

#include "fluxes/plasma_laws.hpp"

#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

void require(bool condition, const std::string& message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Shares and edge speeds; fluxes hold the shares.
PlasmaState without_density(const PlasmaMix& mix) {
    require(std::isfinite(mix.electron_temperature_ev) && mix.electron_temperature_ev > 0,
            "the electron temperature must be above zero");
    require(!mix.ions.empty(), "a plasma needs at least one positive ion");
    PlasmaState state;
    state.electron_temperature_ev = mix.electron_temperature_ev;
    double sum = 0;
    for (const PlasmaMix::Ion& ion : mix.ions) {
        require(std::isfinite(ion.flux_share) && ion.flux_share >= 0,
                "the flux share of " + ion.name + " must not be negative");
        require(std::isfinite(ion.mass_amu) && ion.mass_amu > 0,
                "the mass of " + ion.name + " must be above zero");
        sum += ion.flux_share;
    }
    require(sum > 0, "the flux shares of the ions are all zero");
    const double slower = electronegative_factor(mix.negative_ions, mix.negative_temperature_ratio);
    double squares = 0; // at one speed, shares of the flux are shares of the density
    for (const PlasmaMix::Ion& ion : mix.ions) {
        const double bohm = bohm_speed(mix.electron_temperature_ev, ion.mass_amu);
        state.ions.push_back({ion.name, ion.mass_amu, ion.flux_share / sum, slower * bohm, 0.0});
        squares += ion.flux_share / sum * bohm * bohm;
    }
    if (mix.common_sound_speed)
        for (PlasmaState::Ion& ion : state.ions)
            ion.edge_speed = slower * std::sqrt(squares);
    return state;
}

double edge_ratio(const PlasmaMix& mix) {
    require(std::isfinite(mix.edge_over_bulk) && mix.edge_over_bulk >= 0 && mix.edge_over_bulk <= 1,
            "the edge density over the bulk density must lie between 0 and 1");
    return mix.edge_over_bulk > 0 ? mix.edge_over_bulk : collisionless_edge_ratio();
}

PlasmaState complete(PlasmaState state, const PlasmaMix& mix, double ion_flux,
                     double edge_electrons) {
    const double te = mix.electron_temperature_ev, ratio = edge_ratio(mix);
    state.ion_flux = ion_flux;
    for (PlasmaState::Ion& ion : state.ions) {
        ion.flux *= ion_flux;
        ion.edge_density = ion.flux / ion.edge_speed;
    }
    state.edge_electrons = edge_electrons;
    state.bulk_electrons = edge_electrons / ratio;
    state.electron_flux = thermal_flux(edge_electrons, thermal_speed(te, electron_mass_amu));
    state.debye_length_nm = debye_length_nm(te, edge_electrons);
    state.presheath_drop_v = -te * std::log(ratio); // Boltzmann electrons
    state.floating_drop_v = floating_drop_v(te, edge_electrons, ion_flux);
    state.plasma_potential_v = state.presheath_drop_v + state.floating_drop_v;
    return state;
}

/// Positive charges at the edge for a unit ion flux [s/nm].
double density_per_flux(const PlasmaState& state) {
    double sum = 0;
    for (const PlasmaState::Ion& ion : state.ions)
        sum += ion.flux / ion.edge_speed;
    return sum;
}

} // namespace

PlasmaState state_from_flux(const PlasmaMix& mix, double ion_flux) {
    require(std::isfinite(ion_flux) && ion_flux > 0, "the ion flux must be above zero");
    const PlasmaState state = without_density(mix);
    return complete(state, mix, ion_flux,
                    ion_flux * density_per_flux(state) / (1 + mix.negative_ions));
}

PlasmaState state_from_bulk_density(const PlasmaMix& mix, double bulk_electrons) {
    require(std::isfinite(bulk_electrons) && bulk_electrons > 0,
            "the electron density must be above zero");
    const PlasmaState state = without_density(mix);
    const double electrons = edge_ratio(mix) * bulk_electrons;
    return complete(state, mix, electrons * (1 + mix.negative_ions) / density_per_flux(state),
                    electrons);
}

} // namespace rille::fluxes
