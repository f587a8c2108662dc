// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/collisions_file.hpp"
#include "engine/materials_file.hpp"
#include "engine/sheath_model.hpp"
#include "engine/version.hpp"
#include "engine/words.hpp"
#include "fluxes/plasma_laws.hpp"

#include <fmt/format.h>

#include <filesystem>

namespace rille::engine {

namespace {

/// A mass that densities of neutrals need.
double mass_of(const std::string& neutral, const MaterialsLibrary& library, const Entry& at,
               Problems& problems) {
    if (const SpeciesData* data = library.neutral(neutral)) return data->mass_amu;
    problems.add(at.at, at.path,
                 fmt::format("the mass of {} is not known; known are {}{}", neutral,
                             listed(names_of(library.neutrals)),
                             did_you_mean(neutral, names_of(library.neutrals))));
    return 0;
}

void fill_neutrals(const Entry& entry, const MaterialsLibrary& library, Plasma& plasma,
                   Problems& problems) {
    for (PlasmaNeutral& neutral : plasma.neutrals) {
        if (!(neutral.density > 0)) continue;
        const double mass =
            mass_of(neutral.name, library, entry["neutrals"][neutral.name], problems);
        if (mass > 0)
            neutral.flux = fluxes::thermal_flux(
                neutral.density,
                fluxes::thermal_speed(fluxes::ev_per_kelvin * neutral.temperature_k, mass));
    }
}

/// The collisions of each ion with each gas; says which pairs are not known.
std::vector<std::vector<fluxes::CollisionProcess>>
collisions_of(const Plasma& plasma, const std::vector<IonCollision>& known,
              const MaterialsLibrary& library, Case& result) {
    std::vector<std::vector<fluxes::CollisionProcess>> all(plasma.ions.size());
    for (std::size_t i = 0; i < plasma.ions.size(); ++i)
        for (const PlasmaGas& gas : plasma.gases) {
            const SpeciesData* data = library.neutral(gas.name);
            bool found = false;
            for (const IonCollision& collision : known) {
                if (collision.ion != plasma.ions[i].name || collision.gas != gas.name || !data)
                    continue;
                found = true;
                for (auto& process :
                     processes_of(collision, plasma.ions[i].mass_amu, data->mass_amu, gas.density))
                    all[i].push_back(std::move(process));
                for (const auto& [standing, count] : collision.standing)
                    result.standing[standing] += count;
            }
            if (!found)
                result.warnings.push_back(
                    fmt::format("plasma {}: collisions of {} with {} are not known and left out",
                                plasma.name, plasma.ions[i].name, gas.name));
        }
    return all;
}

void solve(const Entry& entry, const MaterialsLibrary& library, Case& result, Plasma& plasma,
           Problems& problems) {
    const Entry& bias = entry["rf_bias"];
    std::vector<std::vector<fluxes::CollisionProcess>> collisions;
    const bool collide = bias.is_given && plasma.sheath_options.collisions;
    if (collide && plasma.gases.empty() && entry["pressure"].is_given)
        result.warnings.push_back(
            fmt::format("plasma {}: the gas is not known, so collisions in the sheath are left "
                        "out; give flows",
                        plasma.name));
    if (collide && !plasma.gases.empty()) {
        const std::string file = plasma.cross_sections.empty()
                                     ? configs_folder() + "/ion_collisions.yaml"
                                     : plasma.cross_sections;
        const std::size_t before = problems.size();
        const auto known =
            read_collisions(file, std::filesystem::path(file).filename().string(), problems);
        if (problems.size() != before) return;
        collisions = collisions_of(plasma, known, library, result);
    }
    try {
        plasma.arrivals =
            std::make_shared<SheathResult>(solve_sheath(plasma, collisions, result.seed));
    } catch (const std::domain_error& error) {
        problems.add(bias.at, bias.path, std::string(error.what()) + "; give ion_energies instead");
        return;
    } catch (const std::invalid_argument& error) {
        problems.add(bias.is_given ? bias.at : entry.at, bias.is_given ? bias.path : entry.path,
                     error.what());
        return;
    }
    for (const std::string& warning : plasma.arrivals->warnings)
        result.warnings.push_back("plasma " + plasma.name + ": " + warning);
}

} // namespace

void build_arrivals(const Entry& root, Case& result, Problems& problems) {
    if (!problems.empty()) return; // what is wrong would only be told again
    const MaterialsLibrary library = load_materials(configs_folder(), problems);
    for (auto& [name, plasma] : result.plasmas) {
        const Entry& entry = root["plasmas"][name];
        fill_neutrals(entry, library, plasma, problems);
        if (problems.empty()) solve(entry, library, result, plasma, problems);
    }
}

} // namespace rille::engine
