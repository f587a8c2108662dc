// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "engine/problems.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// Reads a case file with everything it names (chemistry, ion tables). `overrides` are texts
/// "key.path=value": the path goes through keys and, in lists, through the `name` of the item;
/// the value is YAML. Throws InputError with every problem found, in the order of the file.
Case load_case(const std::string& path, const std::vector<std::string>& overrides = {});

/// The same from text; `name` stands for the file in messages, relative paths start in `folder`.
Case parse_case(const std::string& text, const std::string& name, const std::string& folder,
                const std::vector<std::string>& overrides = {});

} // namespace rille::engine
