// SPDX-License-Identifier: Apache-2.0
#include "engine/version.hpp"

#include <cstdlib>
#include <filesystem>
#include <stdexcept>

namespace rille::engine {

std::string version() {
    return RILLE_VERSION;
}
std::string revision() {
    return RILLE_REVISION;
}
std::string build_info() {
    return RILLE_BUILD_TYPE ", " RILLE_COMPILER;
}

std::string configs_folder() {
    const char* named = std::getenv("RILLE_CONFIGS");
    for (const std::string& folder :
         {std::string(named ? named : ""), std::string(RILLE_SOURCE_CONFIGS),
          std::string(RILLE_INSTALLED_CONFIGS)})
        if (!folder.empty() && std::filesystem::is_directory(folder)) return folder;
    throw std::runtime_error("no folder with materials and chemistries found; set RILLE_CONFIGS");
}

} // namespace rille::engine
