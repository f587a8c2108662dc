// SPDX-License-Identifier: Apache-2.0
// What made the shape: the surface examined path by path, and what each cause has removed.
#include "engine/simulation.hpp"

#include "engine/sources.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::engine {

Simulation::Examined Simulation::examine(const fluxes::Mechanism& mechanism,
                                         const std::string& plasma) const {
    double highest = -std::numeric_limits<double>::infinity();
    for (const geometry::Vec3& v : surface_.vertices)
        highest = std::max(highest, v.z);
    const geometry::RayCaster caster(case_.domain, surface_, highest + 2 * case_.domain.spacing);
    fluxes::Sampling sampling;
    sampling.rays_per_element = case_.rays_per_element;
    sampling.ions_per_species = case_.ions_per_species;
    sampling.seed = case_.seed;
    sampling.refresh = 0; // the same whenever it is asked for
    sampling.detailed = true;
    Examined found;
    found.step = fluxes::solve_surface(
        case_.domain, surface_, caster, materials_in_reach(surface_, films_), mechanism,
        case_.reflection, sources_of(case_, case_.plasmas.at(plasma)), sampling, &present_);
    found.rays = caster.traced();
    found.lost_rays = caster.lost();
    return found;
}

/// Shares out the way of every element among the causes: each gets its rate times the time, and
/// what the way differs by (rates of other normals and of films below) goes to all of them in
/// proportion to their size.
void Simulation::add_removed(const Trial& trial, const fluxes::SurfaceStep& step) {
    const double dt = trial.report.time;
    const std::size_t supplies = step.supply.size(), floors = removed_.size() / 2;
    for (std::size_t e = 0; e < surface_.size(); ++e) {
        const double moved = trial.report.moved[e];
        const bool is_floor = surface_.normal[e].z > 0.5;
        const std::size_t at = is_floor ? floors : 0;
        for (std::size_t k = 0; k < floors && is_floor; ++k)
            removed_[k].value[e] = 0; // a wall begins where the floor has left it
        double sum = 0, size = 0;
        for (const auto& cause : step.cause) {
            sum += cause[e];
            size += std::fabs(cause[e]);
        }
        const double beyond = moved - sum * dt;
        for (std::size_t k = 0; k < step.cause.size() && size > 0; ++k)
            removed_[at + k].value[e] +=
                step.cause[k][e] * dt + beyond * (std::fabs(step.cause[k][e]) / size);
        if (!(size > 0)) removed_[at + unexplained_removal].value[e] += moved;
        const bool balanced = std::fabs(sum) < 0.1 * size || size == 0;
        const double stretch = balanced ? 1.0 : std::clamp(moved / (sum * dt), 0.5, 2.0);
        for (std::size_t s = 0; s < supplies; ++s)
            removed_[at + unexplained_removal + 1 + s].value[e] += step.supply[s][e] * dt * stretch;
    }
}

void Simulation::list_removed(std::size_t size, std::vector<geometry::SurfaceField*>& fields) {
    for (auto& field : removed_) {
        const bool any =
            std::any_of(field.value.begin(), field.value.end(), [](double v) { return v != 0; });
        if (any)
            fields.push_back(&field);
        else
            field.value.assign(size, 0.0);
    }
}

} // namespace rille::engine
