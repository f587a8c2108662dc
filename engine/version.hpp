// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>

namespace rille::engine {

std::string version();    ///< "0.1.0"
std::string revision();   ///< source revision of the build, empty if unknown
std::string build_info(); ///< build type and compiler
/// Folder of the cited data (materials, chemistries): RILLE_CONFIGS from the environment, else the
/// source tree of the build, else the installed folder. Throws std::runtime_error if none exists.
std::string configs_folder();

} // namespace rille::engine
