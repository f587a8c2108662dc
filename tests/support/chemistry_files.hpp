// SPDX-License-Identifier: Apache-2.0
#pragma once

// Loading chemistries of the configs folder in tests.

#include "engine/chemistry_file.hpp"
#include "engine/materials_file.hpp"

#include <catch2/catch.hpp>

#include <string>
#include <vector>

namespace rille::engine {

inline const std::string configs = std::string(RILLE_ROOT) + "/configs";

inline std::string report_of(const Problems& problems) {
    std::string text;
    for (const Problem& problem : problems.sorted())
        text += (text.empty() ? "" : "\n") + describe(problem);
    return text;
}

inline const MaterialsLibrary& library() {
    static const MaterialsLibrary loaded = [] {
        Problems problems;
        MaterialsLibrary found = load_materials(configs, problems);
        INFO(report_of(problems));
        REQUIRE(problems.empty());
        return found;
    }();
    return loaded;
}

/// A name on a line of an imagined case.
inline NamedUse use_of(const std::string& name, int line, int column, const std::string& path) {
    NamedUse use;
    use.name = name;
    use.at.file = "case.yaml";
    use.at.line = line;
    use.at.column = column;
    use.path = path;
    return use;
}

inline std::vector<NamedUse> uses(const std::vector<std::string>& names) {
    std::vector<NamedUse> list;
    int line = 10;
    for (const std::string& name : names)
        list.push_back(use_of(name, line++, 5, "stack." + name));
    return list;
}

inline ChemistryRequest request(const std::string& name,
                                const std::vector<std::string>& materials) {
    ChemistryRequest r;
    r.chemistry = use_of(name, 3, 12, "chemistry");
    r.configs = configs;
    r.case_folder = ".";
    r.materials = uses(materials);
    return r;
}

inline Chemistry load(const std::string& name, const std::vector<std::string>& materials) {
    Problems problems;
    std::optional<Chemistry> found = load_chemistry(request(name, materials), library(), problems);
    INFO(report_of(problems));
    REQUIRE(found);
    return *found;
}

} // namespace rille::engine
