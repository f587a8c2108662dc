// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath.hpp"

#include <string>
#include <vector>

namespace rille::fluxes {

/// Ar+ in Ar against the ion's energy in eV with the target at rest; held at 0.1 eV below that.
/// Source: Phelps, J. Appl. Phys. 76 (1994) 747. `exponent` belongs to the isotropic part: 2.3 is
/// in the formula that comes with the tables of the LXCat site and gives their digits; several
/// programs that cite the same paper use 2.0.
struct PhelpsArgon {
    double exponent = 2.3;

    /// Momentum transfer, isotropic part and backward part (charge exchange) [nm^2].
    double momentum_nm2(double energy_ev) const;
    double isotropic_nm2(double energy_ev) const;
    double backward_nm2(double energy_ev) const;
};

/// The two processes of argon ions in argon of `gas_density` [nm^-3], tabulated from 0.1 eV to
/// 10 keV: backward scattering as charge exchange, the rest isotropic.
std::vector<CollisionProcess> argon_in_argon(double gas_density, const PhelpsArgon& = {});

/// Capture by the polarised neutral (Langevin) [nm^2]: k / v with
/// k = e sqrt(pi alpha / (epsilon_0 mu)), alpha the polarisability volume and v the ion's speed
/// against a target at rest. From memory. All arguments above zero, else std::invalid_argument.
double capture_nm2(double energy_ev, double ion_mass_amu, double gas_mass_amu,
                   double polarisability_nm3);

/// Capture as a process, tabulated from 0.1 eV to 10 keV.
CollisionProcess capture_process(CollisionProcess::Kind, double ion_mass_amu, std::string gas,
                                 double gas_mass_amu, double gas_density,
                                 double polarisability_nm3);

/// The same cross section at every energy. Negative numbers and masses not above zero throw
/// std::invalid_argument.
CollisionProcess constant_process(CollisionProcess::Kind, std::string gas, double gas_mass_amu,
                                  double gas_density, double cross_section_nm2);

/// Cross section of a process at an energy: straight lines in the logarithms, constant beyond the
/// ends; straight in the cross section itself where one end is zero.
double cross_section_nm2(const CollisionProcess&, double energy_ev);

/// Throws std::invalid_argument unless energies increase strictly from above zero, each has a
/// cross section >= 0, all are finite, and mass and density of the gas can be.
void check_process(const CollisionProcess&);

} // namespace rille::fluxes
