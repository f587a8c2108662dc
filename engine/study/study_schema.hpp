// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/rule.hpp"

#include <string>

namespace rille::engine {

/// The one table of everything a study file may hold.
const Rule& study_rules();

/// That table as JSON Schema (draft 2020-12), for editors that complete and check.
std::string study_json_schema();

} // namespace rille::engine
