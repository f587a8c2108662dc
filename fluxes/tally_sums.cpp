// SPDX-License-Identifier: Apache-2.0
#include "fluxes/tally_sums.hpp"

#include "fluxes/surface_chemistry.hpp"

#include <algorithm>
#include <numeric>

namespace rille::fluxes {
namespace {

template <class T>
int place_of(const T& wanted, std::vector<T>& known) {
    const auto found = std::find(known.begin(), known.end(), wanted);
    const int place = static_cast<int>(found - known.begin());
    if (found == known.end()) known.push_back(wanted);
    return place;
}

/// Puts one sum in place of each list of tallies.
struct PutSums {
    std::vector<std::vector<int>>& members;
    std::vector<int>& acting; ///< on the material

    void replace(Tallies& tallies) const {
        if (!tallies.empty()) tallies = {place_of(place_of(tallies, members), acting)};
    }
    void operator()(Adsorption& p) const { replace(p.assistance.tallies); }
    void operator()(Deposition& p) const { replace(p.assistance.tallies); }
    void operator()(IonAdsorption& p) const { replace(p.tallies); }
    void operator()(IonEnhancedEtching& p) const { replace(p.tallies); }
    void operator()(PhysicalSputtering& p) const { replace(p.tallies); }
    void operator()(IonRemoval& p) const { replace(p.tallies); }
    void operator()(Redeposition& p) const {
        for (FilmRemoval& removal : p.removal)
            replace(removal.tallies);
    }
    void operator()(Desorption&) const {}
    void operator()(Recombination&) const {}
    void operator()(SpontaneousEtching&) const {}
    void operator()(ThermalEtching&) const {}
    void operator()(NeutralRemoval&) const {}
};

} // namespace

TallySums sum_tallies(const Mechanism& mechanism) {
    TallySums sums{{}, {}, mechanism};
    std::size_t most = 0;
    for (SurfaceChemistry& surface : sums.mechanism.surfaces) {
        std::vector<int> acting;
        for (SurfaceProcess& process : surface.processes)
            std::visit(PutSums{sums.members, acting}, process);
        most = std::max(most, acting.size());
        sums.of_material.push_back(std::move(acting));
    }
    sums.mechanism.tallies.assign(most, Tally{});
    return sums;
}

TallySums every_tally(const Mechanism& mechanism) {
    TallySums sums{{}, {}, mechanism};
    std::vector<int> all(mechanism.tallies.size());
    std::iota(all.begin(), all.end(), 0);
    for (const int m : all)
        sums.members.push_back({m});
    sums.of_material.assign(mechanism.surfaces.size(), all);
    return sums;
}

} // namespace rille::fluxes
