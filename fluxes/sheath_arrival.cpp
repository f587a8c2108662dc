// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_arrival.hpp"

#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath_collided.hpp"
#include "fluxes/sheath_filter.hpp"

#include <stdexcept>
#include <utility>

namespace rille::fluxes {

void check_range(const Sheath& sheath, const SheathIon& ion) {
    if (sheath.voltage.lowest() < 0)
        throw std::domain_error("the wafer would lie above the plasma for part of the period");
    const double thermal_ev = ev_per_kelvin * ion.gas_temperature_k;
    const double collisions = collisionality(sheath, ion);
    if (collisions > most_collisions || collisions * thermal_ev > sheath.voltage.mean())
        throw std::domain_error("ions of " + ion.name +
                                " collide so often that they drift through the sheath, which "
                                "neither the closed form nor trajectories describe");
}

SheathWay way_through(const Sheath& sheath, const SheathIon& ion) {
    if (collisionality(sheath, ion) >= collisionless_below) return SheathWay::trajectories;
    if (sheath.voltage.is_steady()) return SheathWay::free_fall;
    return sheath.edge == SheathEdge::moving ? SheathWay::trajectories : SheathWay::closed_form;
}

namespace {

IonDistribution whole(const std::vector<FewCollisions::Part>& parts, double own,
                      const IonDistribution* first) {
    std::vector<double> weight;
    std::vector<IonDistribution> part;
    if (first) {
        weight.push_back(own);
        part.push_back(*first);
    }
    for (const FewCollisions::Part& p : parts) {
        weight.push_back(p.per_ion);
        part.push_back(p.particles);
    }
    return IonDistribution::mixture(std::move(weight), std::move(part));
}

} // namespace

SheathArrival arrive_in_closed_form(const Sheath& sheath, const SheathIon& ion) {
    SheathArrival arrival;
    arrival.way = way_through(sheath, ion);
    const FewCollisions few = few_collisions(sheath, ion);
    const IonDistribution free = damped_arrival(sheath, ion, few.uncollided_gain);
    arrival.ions.push_back(whole(few.ions, few.uncollided, &free));
    if (few.fast_neutrals.empty()) return arrival;
    arrival.fast_neutrals.push_back(whole(few.fast_neutrals, 0, nullptr));
    for (const FewCollisions::Part& part : few.fast_neutrals)
        arrival.fast_neutrals_per_ion += part.per_ion;
    return arrival;
}

BinnedTrajectories follow_into_bins(const Sheath& sheath, const SheathIon& ion,
                                    const TrajectorySampling& sampling) {
    const Arrivals followed = follow_ions(sheath, ion, sampling);
    BinnedTrajectories binned;
    binned.ions = bins_of(followed.ions);
    if (followed.fast_neutrals.empty()) return binned;
    binned.fast_neutrals = bins_of(followed.fast_neutrals);
    binned.fast_neutrals_per_ion = static_cast<double>(followed.fast_neutrals.size()) /
                                   static_cast<double>(followed.ions.size());
    return binned;
}

SheathArrival arrival_of(const BinnedTrajectories& binned) {
    SheathArrival arrival;
    arrival.way = SheathWay::trajectories;
    arrival.ions.push_back(binned.ions.distribution());
    if (binned.fast_neutrals_per_ion > 0)
        arrival.fast_neutrals.push_back(binned.fast_neutrals.distribution());
    arrival.fast_neutrals_per_ion = binned.fast_neutrals_per_ion;
    return arrival;
}

SheathArrival arrive(const Sheath& sheath, const SheathIon& ion,
                     const TrajectorySampling& sampling) {
    check_range(sheath, ion);
    if (way_through(sheath, ion) == SheathWay::trajectories)
        return arrival_of(follow_into_bins(sheath, ion, sampling));
    return arrive_in_closed_form(sheath, ion);
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
