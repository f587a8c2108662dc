// SPDX-License-Identifier: Apache-2.0
// The surface as it stands, examined path by path.
#include "engine/simulation.hpp"

#include "engine/sources.hpp"

#include <algorithm>
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

} // namespace rille::engine
