// SPDX-License-Identifier: Apache-2.0
#include "engine/materials_file.hpp"

#include "engine/parameters.hpp"
#include "engine/reflection_reader.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

namespace {

template <class T>
const T* find(const std::vector<T>& things, const std::string& name) {
    const auto found = std::find_if(things.begin(), things.end(),
                                    [&](const T& thing) { return thing.name == name; });
    return found == things.end() ? nullptr : &*found;
}

/// The members of one named list in a data file of format 1.
struct DataFile {
    YamlNode root;
    const YamlNode* entries = nullptr;
    const YamlNode* common = nullptr;
};

DataFile open(const std::string& path, const char* list, const char* common, Problems& problems) {
    DataFile file;
    const std::size_t before = problems.size();
    file.root = read_yaml_file(path, problems);
    if (problems.size() != before) return file;
    MapReader map(file.root, problems);
    if (const YamlNode* format = map.required("format")) read_integer(*format, {1, 1}, problems);
    if (common) file.common = map.required(common);
    file.entries = map.required(list);
    map.finish();
    if (file.entries && !file.entries->is_map()) {
        problems.add(file.entries->at, file.entries->path, "a map of names is due");
        file.entries = nullptr;
    }
    return file;
}

MaterialClass class_of(const std::string& word) {
    if (word == "conductor") return MaterialClass::conductor;
    if (word == "semiconductor") return MaterialClass::semiconductor;
    return word == "resist" ? MaterialClass::resist : MaterialClass::insulator;
}

void read_materials(const std::string& path, MaterialsLibrary& library, Problems& problems) {
    const DataFile file = open(path, "materials", "ion_reflection", problems);
    if (!file.entries || !file.common) return;
    ParameterReader shared(problems);
    const fluxes::IonReflection common = read_reflection(*file.common, {}, shared, problems);
    library.common_standing = shared.counts();
    for (const YamlNode::Member& member : file.entries->members) {
        ParameterReader parameters(problems);
        MaterialData data;
        data.name = member.key;
        MapReader map(member.value, problems);
        if (const YamlNode* kind = map.required("class"))
            data.kind = class_of(
                read_word(*kind, {"conductor", "semiconductor", "insulator", "resist"}, problems)
                    .value_or(""));
        if (const YamlNode* unit = map.required("unit"))
            data.unit = read_text(*unit, problems).value_or("");
        data.density =
            parameters.value(map.required("density"), {Dimension::number_density, above_zero()});
        data.reflection = common;
        if (const YamlNode* own = map.required("ion_reflection"))
            data.reflection = read_reflection(*own, common, parameters, problems);
        map.finish();
        data.standing = parameters.counts();
        library.materials.push_back(std::move(data));
    }
}

std::vector<SpeciesData> read_species(const std::string& path, const char* list,
                                      Problems& problems) {
    std::vector<SpeciesData> species;
    const DataFile file = open(path, list, nullptr, problems);
    if (!file.entries) return species;
    ParameterReader parameters(problems);
    for (const YamlNode::Member& member : file.entries->members) {
        MapReader map(member.value, problems);
        species.push_back(
            {member.key, parameters.value(map.required("mass"), {Dimension::mass, above_zero()})});
        map.finish();
    }
    return species;
}

std::vector<ElementData> read_elements(const std::string& path, Problems& problems) {
    std::vector<ElementData> elements;
    const DataFile file = open(path, "elements", nullptr, problems);
    if (!file.entries) return elements;
    ParameterReader parameters(problems);
    for (const YamlNode::Member& member : file.entries->members) {
        MapReader map(member.value, problems);
        ElementData e;
        e.name = member.key;
        e.atomic_number = parameters.value(map.required("atomic_number"), {{}, {1, 120}});
        e.mass_amu = parameters.value(map.required("mass"), {Dimension::mass, above_zero()});
        if (const YamlNode* us = map.optional("surface_binding_energy"))
            e.surface_binding_ev = parameters.value(us, {Dimension::energy, above_zero()});
        e.w = 0.35 * e.surface_binding_ev; // the paper's value for elements without a fit
        if (const YamlNode* fit = map.optional("yamamura_tawara")) {
            MapReader fitted(*fit, problems);
            e.q = parameters.value(fitted.required("q"), {{}, above_zero()});
            e.w = parameters.value(fitted.required("w"), {{}, zero_or_more()});
            e.s = parameters.value(fitted.required("s"), {{}, above_zero()});
            fitted.finish();
        }
        map.finish();
        elements.push_back(e);
    }
    return elements;
}

} // namespace

fluxes::IonReflection read_reflection(const YamlNode& node, const fluxes::IonReflection& otherwise,
                                      ParameterReader& parameters, Problems& problems) {
    fluxes::IonReflection law = otherwise;
    MapReader map(node, problems);
    const ParameterForm angle{Dimension::angle, {0, 90, false, true}};
    law.critical_deg = parameters.value(map.optional("critical_angle"), angle, law.critical_deg);
    law.exponent = parameters.value(map.optional("exponent"), {{}, above_zero()}, law.exponent);
    law.probability =
        parameters.value(map.optional("grazing_probability"), {{}, {0, 1}}, law.probability);
    law.collisions = static_cast<int>(
        parameters.value(map.optional("collisions"), {{}, {0, 20}}, law.collisions));
    law.target_mass_amu = parameters.value(map.optional("surface_atom_mass"),
                                           {Dimension::mass, above_zero()}, law.target_mass_amu);
    law.scatter_deg =
        parameters.value(map.optional("scatter"), {Dimension::angle, {0, 45}}, law.scatter_deg);
    map.finish();
    return law;
}

const MaterialData* MaterialsLibrary::material(const std::string& name) const {
    return find(materials, name);
}
const SpeciesData* MaterialsLibrary::ion(const std::string& name) const {
    return find(ions, name);
}
const SpeciesData* MaterialsLibrary::neutral(const std::string& name) const {
    return find(neutrals, name);
}
const ElementData* MaterialsLibrary::element(const std::string& name) const {
    return find(elements, name);
}

MaterialsLibrary load_materials(const std::string& configs_folder, Problems& problems) {
    MaterialsLibrary library;
    read_materials(configs_folder + "/materials.yaml", library, problems);
    library.ions = read_species(configs_folder + "/ions.yaml", "ions", problems);
    library.neutrals = read_species(configs_folder + "/neutrals.yaml", "neutrals", problems);
    library.elements = read_elements(configs_folder + "/elements.yaml", problems);
    return library;
}

} // namespace rille::engine
