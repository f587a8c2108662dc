// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"
#include "engine/chemistry_file.hpp"
#include "engine/materials_file.hpp"
#include "engine/version.hpp"

#include <algorithm>
#include <filesystem>

namespace rille::engine {

namespace {

/// The first `material: NAME` at or below an entry.
const Entry* find_material(const Entry& entry, const std::string& name) {
    for (const auto& [key, value] : entry.members) {
        if (key == "material" && value.text == name) return &value;
        if (const Entry* found = find_material(value, name)) return found;
    }
    for (const Entry& item : entry.items)
        if (const Entry* found = find_material(item, name)) return found;
    return nullptr;
}

NamedUse use_of(const std::string& name, const Entry& entry) {
    NamedUse use;
    use.name = name;
    use.at = entry.at;
    use.path = entry.path;
    return use;
}

void add_use(std::vector<NamedUse>& uses, const std::string& name, const Entry& entry) {
    const bool known = std::any_of(uses.begin(), uses.end(),
                                   [&](const NamedUse& use) { return use.name == name; });
    if (!known) uses.push_back({name, entry.at, entry.path});
}

ChemistryRequest request_of(const Entry& root, const std::string& folder, const Case& the_case) {
    ChemistryRequest request;
    const Entry& chemistry = root["chemistry"];
    request.chemistry = use_of(chemistry.text, chemistry);
    request.configs = configs_folder();
    request.case_folder = folder;
    for (const std::string& name : the_case.materials) {
        const Entry* entry = find_material(root, name);
        request.materials.push_back(use_of(name, entry ? *entry : root["stack"]));
    }
    request.ions.emplace();
    request.neutrals.emplace();
    for (const auto& [plasma, entry] : root["plasmas"].members) {
        for (const auto& [name, ion] : entry["ions"].members)
            add_use(*request.ions, name, ion);
        for (const auto& [name, neutral] : entry["neutrals"].members)
            add_use(*request.neutrals, name, neutral);
    }
    return request;
}

} // namespace

void build_chemistry(const Entry& root, const std::string& folder, Case& result,
                     Problems& problems) {
    if (!root["chemistry"].is_good) return;
    result.chemistry = std::filesystem::path(root["chemistry"].text).filename().string();
    const ChemistryRequest request = request_of(root, folder, result);
    const MaterialsLibrary library = load_materials(request.configs, problems);
    std::optional<Chemistry> chemistry = load_chemistry(request, library, problems);
    for (auto& [name, plasma] : result.plasmas)
        for (PlasmaIon& ion : plasma.ions)
            if (const SpeciesData* data = library.ion(ion.name)) ion.mass_amu = data->mass_amu;
    if (!chemistry) return;
    result.materials = std::move(chemistry->materials);
    for (const std::string& name : result.materials) {
        const MaterialData* data = library.material(name);
        // Resists charge up like any other insulator.
        const bool insulates =
            data && (data->kind == MaterialClass::insulator || data->kind == MaterialClass::resist);
        result.insulator.push_back(insulates ? 1 : 0);
    }
    result.mechanism = std::move(chemistry->mechanism);
    result.reflection = std::move(chemistry->reflection);
    result.standing = std::move(chemistry->standing);
    result.open_parameters = std::move(chemistry->open);
}

} // namespace rille::engine
