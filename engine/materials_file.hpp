// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"
#include "fluxes/mechanism.hpp"

#include <map>
#include <string>
#include <vector>

namespace rille::engine {

enum class MaterialClass { conductor, semiconductor, insulator, resist };

/// One material of configs/materials.yaml.
struct MaterialData {
    std::string name;
    MaterialClass kind = MaterialClass::insulator;
    std::string unit;   ///< what one unit of the density is: "Si atoms", "SiO2"
    double density = 0; ///< units [nm^-3]
    fluxes::IonReflection reflection;
    std::map<fluxes::Standing, int> standing; ///< of its own values
};

/// One ion of configs/ions.yaml or neutral of configs/neutrals.yaml.
struct SpeciesData {
    std::string name;
    double mass_amu = 0;
};

/// One element of configs/elements.yaml: what the collision theories of sputtering need.
struct ElementData {
    std::string name;
    double atomic_number = 0, mass_amu = 0;
    double surface_binding_ev = 0;
    double q = 1, w = 0, s = 2.5; ///< of the Yamamura-Tawara law
};

/// The data common to every chemistry, in the order of the files.
struct MaterialsLibrary {
    std::vector<MaterialData> materials;
    std::vector<SpeciesData> ions, neutrals;
    std::vector<ElementData> elements;
    std::map<fluxes::Standing, int> common_standing; ///< of the reflection law that all share

    /// nullptr if there is none of that name.
    const MaterialData* material(const std::string& name) const;
    const SpeciesData* ion(const std::string& name) const;
    const SpeciesData* neutral(const std::string& name) const;
    const ElementData* element(const std::string& name) const;
};

/// Reads the four files of a configs folder. Problems are added to the list.
MaterialsLibrary load_materials(const std::string& configs_folder, Problems&);

/// Names, for "it knows ..." messages.
template <class T>
std::vector<std::string> names_of(const std::vector<T>& things) {
    std::vector<std::string> names;
    for (const T& thing : things)
        names.push_back(thing.name);
    return names;
}

} // namespace rille::engine
