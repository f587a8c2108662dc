// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/materials_file.hpp"
#include "engine/parameters.hpp"
#include "engine/problems.hpp"
#include "fluxes/mechanism.hpp"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// A name that a case uses, and where it says so.
struct NamedUse {
    std::string name;
    Location at;
    std::string path;
};

/// What a case asks of a chemistry.
struct ChemistryRequest {
    NamedUse chemistry;              ///< "silicon-cl2-ar", or a path if it holds / or ends in .yaml
    std::string configs;             ///< configs folder
    std::string case_folder;         ///< relative paths start here
    std::vector<NamedUse> materials; ///< ids of the run in this order
    std::optional<std::vector<NamedUse>> ions;     ///< none: every ion of the chemistry
    std::optional<std::vector<NamedUse>> neutrals; ///< none: every neutral
};

/// A chemistry made ready for a run.
struct Chemistry {
    std::string title;
    std::string file;                   ///< as found
    std::vector<std::string> materials; ///< those asked for, then the films that may grow
    fluxes::Mechanism mechanism;        ///< surfaces in the order of `materials`
    std::vector<fluxes::IonReflection> reflection;
    std::map<fluxes::Standing, int> standing; ///< parameters in use
    std::vector<OpenParameter> open;          ///< those of them that no source settles
};

/// Reads a chemistry file and builds the mechanism. Species that the case does not use are left
/// out. Materials, ions and neutrals that the chemistry does not know are problems at the place
/// where the case names them. Returns nothing if there was any problem.
std::optional<Chemistry> load_chemistry(const ChemistryRequest&, const MaterialsLibrary&,
                                        Problems&);

/// Names of the chemistries in a configs folder, sorted.
std::vector<std::string> chemistry_names(const std::string& configs);

} // namespace rille::engine
