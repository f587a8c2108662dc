// SPDX-License-Identifier: Apache-2.0
// A trench through a mask into one film, built in code: the mechanism is the test's own, so that
// each trend has one cause.
#pragma once

#include "engine/case.hpp"
#include "fluxes/surface_chemistry.hpp"

#include <limits>
#include <string>
#include <vector>

namespace rille::tests {

/// Materials of the case: 0 film, 1 mask, 2 stop, 3 deposited film.
struct TrenchCase {
    engine::Case c;

    TrenchCase(double pitch, double spacing, double mask_thickness, double film_thickness) {
        c.title = "test trench";
        c.domain.spacing = spacing;
        c.domain.cells_x = static_cast<int>(pitch / spacing + 0.5);
        c.spacing_asked = spacing;
        c.materials = {"film", "mask", "stop", "deposit"};
        c.insulator = {0, 0, 0, 0};
        const double deep = std::numeric_limits<double>::infinity();
        c.films = {{"mask", 1, mask_thickness, 0},
                   {"film", 0, 0, -film_thickness},
                   {"stop", 2, -film_thickness, -deep}};
        c.substrate_first = 1;
        c.mask.thickness = mask_thickness;
        c.mask_material = "mask";
        c.reflection.resize(4);
        for (auto& law : c.reflection)
            law.probability = 0;
        c.ions_per_species = 0;
        auto& m = c.mechanism;
        m.name = "test";
        m.surfaces.resize(4);
        for (int s = 0; s < 4; ++s)
            m.surfaces[s].material = c.materials[s];
        plasma().name = "main";
    }

    engine::Plasma& plasma() { return c.plasmas["main"]; }
    fluxes::SurfaceChemistry& chemistry(int material) { return c.mechanism.surfaces[material]; }

    void add_opening(const std::string& name, double cd, double centre = 0) {
        geometry::Opening opening;
        opening.name = name;
        opening.width_x = cd;
        opening.centre_x = centre;
        c.mask.openings.push_back(opening);
    }
    /// One ion species "X+" with the given distribution; flux [nm^-2 s^-1].
    void set_ions(double flux, const fluxes::IonDistribution& distribution) {
        c.mechanism.ions = {"X+"};
        plasma().ion_flux = flux;
        plasma().ions = {{"X+", 40, 1.0}};
        plasma().ion_energies.clear();
        plasma().ion_energies.emplace("X+", distribution);
    }
    /// Index of a new tally of the one ion species.
    int add_tally(const fluxes::YieldFunction& yield) {
        c.mechanism.tallies.push_back({0, yield});
        return static_cast<int>(c.mechanism.tallies.size()) - 1;
    }
    /// Index of a new neutral that arrives with this flux [nm^-2 s^-1].
    int add_neutral(const std::string& name, double flux) {
        c.mechanism.neutrals.push_back(name);
        plasma().neutrals.push_back({name, flux, 300});
        return static_cast<int>(c.mechanism.neutrals.size()) - 1;
    }
    void add_step(const std::string& name, double time_s) {
        engine::RecipeStep step;
        step.name = name;
        step.plasma = "main";
        step.end.time_s = time_s;
        c.steps.push_back(step);
    }
    void run_until_reached(const std::string& film, const std::string& at, double limit_s) {
        engine::RecipeStep step;
        step.name = "main";
        step.plasma = "main";
        step.end.kind = engine::StepEnd::Kind::reaches;
        step.end.film = film;
        step.end.at = at;
        step.no_longer_than_s = limit_s;
        c.steps.push_back(step);
    }
};

} // namespace rille::tests
