// SPDX-License-Identifier: Apache-2.0
#include "engine/case.hpp"
#include "engine/run_result.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "geometry/check.hpp"
#include "geometry/stack.hpp"

#include <algorithm>
#include <functional>
#include <set>

namespace rille::engine {
namespace {

constexpr double no_film_nm = 1e-9;  // thinner grown film counts as none
constexpr double just_inside = 1e-3; // [cells] where the material below the front is read
constexpr double seconds_per_minute = 60;

/// Film and outermost material of every element.
void fill_materials(SurfaceState& state, const Case& c) {
    const geometry::Stack stack(c.films);
    const geometry::Surface& s = state.surface;
    state.film.resize(s.size());
    state.material.resize(s.size());
    for (std::size_t e = 0; e < s.size(); ++e) {
        double grown = 0;
        int outermost = -1;
        for (std::size_t f = state.grown.material.size(); f-- > 0;) {
            const double thickness = state.grown.thickness[f][e];
            grown += thickness;
            if (outermost < 0 && thickness > no_film_nm) outermost = state.grown.material[f];
        }
        const double depth = grown + just_inside * c.domain.spacing;
        state.film[e] = stack.film_at(s.centre[e].z - s.normal[e].z * depth);
        state.material[e] = outermost >= 0 ? outermost : c.films[state.film[e]].material;
    }
}

void add_field(SurfaceState& state, const std::string& name, const std::string& unit,
               const std::function<double(std::size_t)>& value) {
    NamedField field{name, unit, std::vector<double>(state.surface.size())};
    for (std::size_t e = 0; e < field.value.size(); ++e)
        field.value[e] = value(e);
    state.fields.push_back(std::move(field));
}

/// One column per adsorbate name over all materials; 0 where the material does not know it.
void add_coverages(SurfaceState& state, const Case& c, const fluxes::SurfaceStep& step) {
    const auto& surfaces = c.mechanism.surfaces;
    std::set<std::string> names;
    for (const auto& chemistry : surfaces)
        names.insert(chemistry.coverages.begin(), chemistry.coverages.end());
    for (const std::string& name : names)
        add_field(state, "coverage_" + name, "1", [&](std::size_t e) {
            const auto material = static_cast<std::size_t>(state.material[e]);
            if (material >= surfaces.size()) return 0.0;
            const auto& known = surfaces[material].coverages;
            const auto at = std::find(known.begin(), known.end(), name);
            return at == known.end() ? 0.0 : step.response[e].coverage[at - known.begin()];
        });
}

void add_causes(SurfaceState& state, const fluxes::SurfaceStep& step) {
    using Response = fluxes::SurfaceResponse;
    const std::pair<const char*, double Response::*> causes[] = {
        {"rate_by_ion_enhanced", &Response::by_ion_enhanced},
        {"rate_by_sputtering", &Response::by_sputtering},
        {"rate_by_spontaneous", &Response::by_spontaneous},
        {"rate_by_deposition", &Response::by_deposition}};
    for (const auto& [name, part] : causes)
        add_field(state, name, "nm_per_min", [&, part = part](std::size_t e) {
            return step.response[e].*part * seconds_per_minute;
        });
}

} // namespace

void fill_state(SurfaceState& state, const Case& c, const fluxes::SurfaceStep& step) {
    const std::size_t n = state.surface.size();
    RILLE_CHECK(step.response.size() == n, "the step was solved on another surface");
    fill_materials(state, c);
    state.rate.resize(n);
    for (std::size_t e = 0; e < n; ++e)
        state.rate[e] = step.response[e].rate;
    state.fields.clear();
    for (std::size_t i = 0; i < step.ion_flux.size(); ++i)
        add_field(state, "ion_flux_" + c.mechanism.ions.at(i), "per_nm2_s",
                  [&](std::size_t e) { return step.ion_flux[i][e]; });
    for (std::size_t i = 0; i < step.fast_neutral_flux.size(); ++i)
        if (!step.fast_neutral_flux[i].empty())
            add_field(state, "fast_neutral_flux_" + c.mechanism.ions.at(i), "per_nm2_s",
                      [&](std::size_t e) { return step.fast_neutral_flux[i][e]; });
    for (std::size_t i = 0; i < step.neutral.size(); ++i)
        add_field(state, "neutral_flux_" + c.mechanism.neutrals.at(i), "per_nm2_s",
                  [&](std::size_t e) { return step.neutral[i][e]; });
    add_coverages(state, c, step);
    add_causes(state, step);
}

} // namespace rille::engine
