// SPDX-License-Identifier: Apache-2.0
#include "engine/open_field.hpp"

#include "engine/sources.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "geometry/ray_caster.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::engine {
namespace {

constexpr double never = std::numeric_limits<double>::infinity();

/// One flat element that fills the period of a small extruded domain.
geometry::Surface flat_surface(const geometry::Domain& domain) {
    geometry::Surface flat;
    const double half = 0.5 * domain.width_x();
    flat.vertices = {{-half, 0, 0}, {half, 0, 0}};
    flat.corners = {{0, 1, -1, -1}};
    flat.centre = {{0, 0, 0}};
    flat.normal = {{0, 0, 1}};
    flat.area = {2 * half};
    flat.next = {-1};
    flat.previous = {-1};
    flat.chain = {0};
    return flat;
}

} // namespace

OpenField::OpenField(const Case& the_case)
    : case_(the_case),
      stack_({the_case.films.begin() + the_case.substrate_first, the_case.films.end()}),
      height_(stack_.films().front().top) {
    if (the_case.liner_thickness > 0) {
        grown_ = the_case.liner_thickness;
        grown_material_ = the_case.liner_material;
    }
}

const fluxes::SurfaceResponse& OpenField::flat(int material, const std::string& plasma) const {
    const auto known = known_.find(plasma);
    return (known == known_.end() ? responses_under(plasma) : known->second).at(material);
}

/// Every material at once: the tables of the ions are large, and serve them all.
const std::vector<fluxes::SurfaceResponse>&
OpenField::responses_under(const std::string& plasma) const {
    geometry::Domain domain;
    domain.spacing = 1;
    domain.cells_x = 4;
    const geometry::Surface surface = flat_surface(domain);
    const geometry::RayCaster caster(domain, surface, 2.0);
    const fluxes::Sources sources = sources_of(case_, case_.plasmas.at(plasma));
    fluxes::Sampling sampling;
    sampling.ions_per_species = 0; // nothing to reflect onto
    fluxes::SurfaceStep before;    // another material under the same ions
    std::vector<fluxes::SurfaceResponse> responses;
    for (int material = 0; material < int(case_.mechanism.surfaces.size()); ++material) {
        const fluxes::MaterialsInReach reach{{0, 1}, {material}};
        const auto solved = fluxes::solve_surface(domain, surface, caster, reach, case_.mechanism,
                                                  case_.reflection, sources, sampling, &before);
        before.ion_tables = solved.ion_tables;
        responses.push_back(solved.response[0]);
    }
    return known_.emplace(plasma, std::move(responses)).first->second;
}

double OpenField::time_to(double z, const std::string& plasma) const {
    double at = height_, time = 0;
    if (grown_ > 0) {
        const double rate = flat(grown_material_, plasma).rate;
        if (rate <= 0) return never;
        time += grown_ / rate;
    }
    while (at > z) {
        const geometry::Film& film = stack_.films()[stack_.film_at(at)];
        const double rate = flat(film.material, plasma).rate;
        if (rate <= 0) return never;
        const double to = std::max(z, film.bottom);
        time += (at - to) / rate;
        at = to;
    }
    return time;
}

void OpenField::advance(double dt_s, const std::string& plasma) {
    if (grown_ > 0) {
        const double rate = flat(grown_material_, plasma).rate;
        const double needed = rate > 0 ? grown_ / rate : never;
        grown_ = needed <= dt_s ? 0.0 : grown_ - rate * dt_s;
        dt_s -= std::min(needed, dt_s);
    }
    while (dt_s > 0) {
        const geometry::Film& film = stack_.films()[stack_.film_at(height_)];
        const fluxes::SurfaceResponse& response = flat(film.material, plasma);
        if (response.rate <= 0) {
            if (response.rate < 0) {
                grown_ -= response.rate * dt_s;
                grown_material_ = response.grown_material;
            }
            return;
        }
        const double needed = (height_ - film.bottom) / response.rate;
        height_ = needed <= dt_s ? film.bottom : height_ - response.rate * dt_s;
        dt_s -= std::min(needed, dt_s);
    }
}

} // namespace rille::engine
