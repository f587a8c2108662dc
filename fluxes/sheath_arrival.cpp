// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_arrival.hpp"

#include "fluxes/sheath_filter.hpp"

#include <stdexcept>

namespace rille::fluxes {

namespace {

constexpr double boltzmann_ev_per_k = 8.617333262e-5; // CODATA 2018

void check_range(const Sheath& sheath, const SheathIon& ion) {
    if (sheath.voltage.lowest() < 0)
        throw std::domain_error("the wafer would lie above the plasma for part of the period");
    const double thermal_ev = boltzmann_ev_per_k * ion.gas_temperature_k;
    if (collisionality(sheath, ion) * thermal_ev > sheath.voltage.mean())
        throw std::domain_error("ions of " + ion.name +
                                " gain less than the gas has in heat between two collisions: they "
                                "drift, which neither the closed form nor trajectories describe");
}

} // namespace

SheathWay way_through(const Sheath& sheath, const SheathIon& ion) {
    if (collisionality(sheath, ion) >= collisionless_below) return SheathWay::trajectories;
    if (sheath.voltage.is_steady()) return SheathWay::free_fall;
    return sheath.edge == SheathEdge::moving ? SheathWay::trajectories : SheathWay::closed_form;
}

SheathArrival arrive(const Sheath& sheath, const SheathIon& ion,
                     const TrajectorySampling& sampling) {
    check_range(sheath, ion);
    SheathArrival arrival;
    arrival.way = way_through(sheath, ion);
    if (arrival.way == SheathWay::free_fall) {
        arrival.ions.push_back(IonDistribution::thermal_fall(
            sheath.voltage.mean() + entry_energy_ev(sheath), ion.transverse_ev, ion.transverse_ev));
    } else if (arrival.way == SheathWay::closed_form) {
        arrival.ions.push_back(damped_arrival(sheath, ion));
    } else {
        const Arrivals followed = follow_ions(sheath, ion, sampling);
        arrival.ions.push_back(distribution_of(followed.ions));
        if (!followed.fast_neutrals.empty()) {
            arrival.fast_neutrals.push_back(distribution_of(followed.fast_neutrals));
            arrival.fast_neutrals_per_ion = static_cast<double>(followed.fast_neutrals.size()) /
                                            static_cast<double>(followed.ions.size());
        }
    }
    return arrival;
}

std::vector<double> content_of(const Sheath& sheath, const SheathIon& ion,
                               const TrajectorySampling& sampling) {
    std::vector<double> content = {sheath.electron_temperature_ev,
                                   sheath.edge_density,
                                   sheath.thickness_nm,
                                   sheath.profile_power,
                                   sheath.edge == SheathEdge::moving ? 1.0 : 0.0,
                                   sheath.voltage.period_s,
                                   ion.mass_amu,
                                   ion.transverse_ev,
                                   ion.gas_temperature_k,
                                   static_cast<double>(sampling.ions),
                                   static_cast<double>(sampling.seed)};
    content.insert(content.end(), sheath.voltage.volt.begin(), sheath.voltage.volt.end());
    for (const CollisionProcess& process : ion.collisions) {
        content.insert(content.end(),
                       {process.kind == CollisionProcess::Kind::isotropic ? 1.0 : 0.0,
                        process.gas_mass_amu, process.gas_density,
                        static_cast<double>(process.energy_ev.size())});
        content.insert(content.end(), process.energy_ev.begin(), process.energy_ev.end());
        content.insert(content.end(), process.cross_section_nm2.begin(),
                       process.cross_section_nm2.end());
    }
    return content;
}

} // namespace rille::fluxes
