// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::fluxes {

/// What is known of the charged part of a plasma in front of the wafer, apart from its density.
struct PlasmaMix {
    struct Ion {
        std::string name;
        double mass_amu = 0;
        double flux_share = 0; ///< of the ion flux to the wafer; shares are normalised to sum 1
    };
    double electron_temperature_ev = 3;
    std::vector<Ion> ions; ///< singly charged
    /// Each ion leaves at its own Bohm speed (default) or all at the common sound speed
    /// sqrt(sum n_i uB_i^2 / sum n_i) (Baalrud, Hegna, Callen 2009, from memory).
    bool common_sound_speed = false;
    /// Negative ions over electrons at the sheath edge, and electron over negative-ion temperature.
    double negative_ions = 0;
    double negative_temperature_ratio = 1;
    /// Edge over bulk electron density; 0: presheath without collisions, exp(-1/2).
    double edge_over_bulk = 0;
};

/// Densities [nm^-3], fluxes [nm^-2 s^-1], speeds [nm/s].
struct PlasmaState {
    struct Ion {
        std::string name;
        double mass_amu = 0;
        double flux = 0;
        double edge_speed = 0;
        double edge_density = 0;
    };
    double electron_temperature_ev = 0;
    std::vector<Ion> ions;
    double ion_flux = 0; ///< sum over the ions
    double edge_electrons = 0;
    double bulk_electrons = 0;
    double electron_flux = 0;      ///< random flux of the electrons at the edge, n v / 4
    double debye_length_nm = 0;    ///< at the edge
    double presheath_drop_v = 0;   ///< bulk to edge
    double floating_drop_v = 0;    ///< edge to a floating wall
    double plasma_potential_v = 0; ///< of the bulk above a floating wall
};

/// The density of the electrons follows from quasi-neutrality at the edge: sum flux_i / speed_i =
/// electrons + negative ions. Both throw std::invalid_argument in plain words.
PlasmaState state_from_flux(const PlasmaMix&, double ion_flux);
PlasmaState state_from_bulk_density(const PlasmaMix&, double bulk_electrons);

} // namespace rille::fluxes
