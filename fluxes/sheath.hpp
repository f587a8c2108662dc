// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"
#include "fluxes/waveform.hpp"

#include <string>
#include <vector>

namespace rille::fluxes {

/// Where the field stands while the voltage swings.
enum class SheathEdge {
    fixed, ///< width of the mean voltage; field ~ Vs(t) x^(m - 1)
    moving ///< uniform ion density, edge at the matrix width of Vs(t)
};

/// A plane sheath above the wafer. x runs from the edge at the plasma towards the wafer.
struct Sheath {
    double electron_temperature_ev = 3;
    double edge_density = 0; ///< electrons at the sheath edge [nm^-3]
    Waveform voltage;        ///< plasma edge minus wafer [V], >= 0 at all times
    double thickness_nm = 0; ///< at the mean voltage
    double profile_power =
        4 / 3.; ///< m of the potential ~ x^m: 4/3 Child, 5/3 collisional, 2 matrix
    SheathEdge edge = SheathEdge::fixed;
};

/// One way in which an ion meets a gas in the sheath.
struct CollisionProcess {
    enum class Kind {
        charge_exchange, ///< the ion leaves as a fast neutral, a thermal ion starts in its place
        isotropic        ///< elastic, isotropic in the frame of the centre of mass
    };
    Kind kind = Kind::charge_exchange;
    std::string gas;
    double gas_mass_amu = 0;
    double gas_density = 0; ///< [nm^-3]
    /// Cross section against the ion's energy with the target at rest, joined by straight lines in
    /// the logarithms, constant beyond the ends. Energies strictly increasing, all above zero.
    std::vector<double> energy_ev;
    std::vector<double> cross_section_nm2;
};

/// One ion species that enters a sheath at its Bohm speed with a Maxwellian spread.
struct SheathIon {
    std::string name;
    double mass_amu = 0;
    double transverse_ev = 0.1;     ///< temperature across the field at the edge
    double gas_temperature_k = 300; ///< of the targets of collisions
    std::vector<CollisionProcess> collisions;
};

/// Ion energy leaving the field-free edge: half the electron temperature, in addition to the drop.
inline double entry_energy_ev(const Sheath& sheath) {
    return 0.5 * sheath.electron_temperature_ev;
}

/// Time that an ion takes through the mean sheath from rest, 3 s / v0 with v0 = sqrt(2 e V / M)
/// [s] (Child law; derived).
double transit_time_s(const Sheath&, double mass_amu);

/// Sheath thickness over the mean free path of all collisions at the mean voltage's energy.
double collisionality(const Sheath&, const SheathIon&);

} // namespace rille::fluxes
