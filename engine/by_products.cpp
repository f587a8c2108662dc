// SPDX-License-Identifier: Apache-2.0
#include "engine/by_products.hpp"

#include "fluxes/surface_chemistry.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

using namespace fluxes;

namespace {

bool has(const std::vector<std::string>& names, const std::string& name) {
    return std::find(names.begin(), names.end(), name) != names.end();
}

void add_new(std::vector<std::string>& names, const std::string& name) {
    if (!has(names, name)) names.push_back(name);
}

/// Names of what a process gives off, and the film that it grows.
void look_at(const YamlNode& process, std::vector<std::string>& products,
             std::vector<std::string>& films) {
    if (const YamlNode* leaves = process.find("leaves_as")) {
        if (leaves->is_scalar()) add_new(products, leaves->text);
        for (const YamlNode::Member& member : leaves->members)
            add_new(products, member.key);
    }
    const YamlNode* film = process.find("film");
    if (film && film->is_scalar()) add_new(films, film->text);
}

/// What ions do to a film where it lies on another material.
std::vector<FilmRemoval> removal_of(const SurfaceChemistry& film) {
    std::vector<FilmRemoval> removal;
    for (const SurfaceProcess& process : film.processes)
        if (const auto* s = std::get_if<PhysicalSputtering>(&process))
            if (s->on.kind == SurfacePart::Kind::whole) removal.push_back({s->tallies, s->leaves});
    return removal;
}

} // namespace

std::vector<std::string> by_products_in_use(const YamlNode& materials, const YamlNode& by_products,
                                            std::vector<std::string> used_materials) {
    std::vector<std::string> products;
    for (std::size_t i = 0; i < used_materials.size(); ++i) { // grows on the way
        const YamlNode* material = materials.find(used_materials[i]);
        const YamlNode* processes = material ? material->find("processes") : nullptr;
        if (!processes) continue;
        for (const YamlNode& process : processes->items)
            look_at(process, products, used_materials);
        for (const std::string& product : products)
            if (const YamlNode* declared = by_products.find(product)) {
                std::vector<std::string> none;
                look_at(*declared, none, used_materials);
            }
    }
    std::vector<std::string> in_order;
    for (const YamlNode::Member& member : by_products.members)
        if (has(products, member.key)) in_order.push_back(member.key);
    return in_order;
}

void add_redeposition(Mechanism& mechanism, int neutral, int film, double sticking,
                      const YamlNode& at, Problems& problems) {
    const std::vector<FilmRemoval> removal = removal_of(mechanism.surfaces[film]);
    const double density = mechanism.surfaces[film].density;
    for (int m = 0; m < static_cast<int>(mechanism.surfaces.size()); ++m) {
        SurfaceChemistry& surface = mechanism.surfaces[m];
        if (surface.material == mechanism.surfaces[film].material) {
            surface.processes.push_back(Deposition{neutral, -1, sticking, density, film, {}});
            continue;
        }
        const int coverage = static_cast<int>(surface.coverages.size());
        if (coverage == max_species) {
            problems.add(at.at, at.path,
                         fmt::format("{} has {} adsorbates, no more are allowed", surface.material,
                                     max_species));
            continue;
        }
        surface.coverages.push_back("redeposited " + mechanism.neutrals[neutral]);
        surface.processes.push_back(
            Redeposition{neutral, coverage, sticking, density, film, removal});
    }
}

} // namespace rille::engine
