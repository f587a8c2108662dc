// SPDX-License-Identifier: Apache-2.0
#include "fluxes/causes.hpp"

#include "fluxes/surface_chemistry.hpp"

#include <cmath>

namespace rille::fluxes {

namespace {

/// The ion-driven parts of a rate, path by path.
struct Split {
    const SurfaceResponse& response;
    const double* by_path;
    int tallies;
    double density;
    CauseRates& rates;

    double share(const SurfacePart& part) const {
        switch (part.kind) {
        case SurfacePart::Kind::bare:
            return response.bare;
        case SurfacePart::Kind::covered:
            return response.coverage[part.coverage];
        case SurfacePart::Kind::whole:
            break;
        }
        return response.outside_films;
    }
    void add(int first, const Tallies& driven_by, double share) const {
        for (int p = 0; p < ion_paths; ++p)
            for (const int m : driven_by)
                rates[first + p] += by_path[p * tallies + m] * share / density;
    }
    void operator()(const IonEnhancedEtching& p) const {
        add(enhanced_cause, p.tallies, response.coverage[p.coverage]);
    }
    void operator()(const PhysicalSputtering& p) const {
        add(sputtering_cause, p.tallies, share(p.on));
    }
    template <class Other>
    void operator()(const Other&) const {}
};

} // namespace

CauseRates cause_rates(const Mechanism& mechanism, int material, const SurfaceResponse& response,
                       const double* by_path) {
    const SurfaceChemistry& surface = mechanism.surfaces[material];
    CauseRates rates{};
    const Split split{response, by_path, static_cast<int>(mechanism.tallies.size()),
                      surface.density, rates};
    for (const SurfaceProcess& process : surface.processes)
        std::visit(split, process);
    rates[neutral_cause] = response.by_spontaneous;
    rates[deposition_cause] = response.by_deposition;
    return rates;
}

SupplyRates supply_rates(const Mechanism& mechanism, int material, const LocalArrivals& all,
                         const double* by_path) {
    constexpr double step = 1e-4;
    const std::size_t tallies = mechanism.tallies.size(), neutrals = mechanism.neutrals.size();
    SupplyRates supply{};
    std::vector<double> ions(tallies);
    std::array<double, max_species> near{};
    for (int p = 0; p < ion_paths; ++p) {
        const double* path = by_path + p * tallies;
        double rate[2], sum = 0;
        for (std::size_t m = 0; m < tallies; ++m)
            sum += path[m];
        if (sum == 0) continue;
        for (const int side : {0, 1}) {
            for (std::size_t m = 0; m < tallies; ++m)
                ions[m] = all.tallies[m] + (side ? step : -step) * path[m];
            rate[side] =
                respond(mechanism, material, {ions.data(), all.neutrals, all.temperature_k}).rate;
        }
        supply[p] = (rate[1] - rate[0]) / (2 * step);
    }
    for (std::size_t k = 0; k < neutrals; ++k) {
        if (all.neutrals[k] == 0) continue;
        double rate[2];
        for (const int side : {0, 1}) {
            for (std::size_t l = 0; l < neutrals; ++l)
                near[l] = all.neutrals[l] * (l == k ? 1 + (side ? step : -step) : 1);
            rate[side] =
                respond(mechanism, material, {all.tallies, near.data(), all.temperature_k}).rate;
        }
        supply[ion_paths + k] = (rate[1] - rate[0]) / (2 * step);
    }
    return supply;
}

} // namespace rille::fluxes
