// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/rule.hpp"

#include <string>

namespace rille::engine {

/// The one table of everything a case file may hold: every key with its kind, unit, default,
/// range and meaning, and the keys that later versions will bring.
const Rule& case_rules();

/// That table as JSON Schema (draft 2020-12), for editors that complete and check.
std::string json_schema();
/// The same of any table of a file.
std::string json_schema(const Rule&, const std::string& title);

} // namespace rille::engine
