// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/parameters.hpp"
#include "fluxes/sheath.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// One kind of collision of one ion with one gas, as configs/ion_collisions.yaml says it.
struct IonCollision {
    enum class Law { constant, table, capture, phelps_argon };
    std::string ion, gas;
    fluxes::CollisionProcess::Kind kind = fluxes::CollisionProcess::Kind::charge_exchange;
    Law law = Law::constant;
    double cross_section_nm2 = 0;  ///< constant
    std::vector<double> energy_ev; ///< table
    std::vector<double> table_nm2; ///< table
    double polarisability_nm3 = 0; ///< capture
    double exponent = 2.3;         ///< phelps_argon
    std::map<fluxes::Standing, int> standing;
};

/// Reads a file of collisions. Problems are added to the list. `shown` is its name in messages.
std::vector<IonCollision> read_collisions(const std::string& path, const std::string& shown,
                                          Problems&);

/// The processes of an entry in a gas of that density [nm^-3].
std::vector<fluxes::CollisionProcess> processes_of(const IonCollision&, double ion_mass_amu,
                                                   double gas_mass_amu, double gas_density);

} // namespace rille::engine
