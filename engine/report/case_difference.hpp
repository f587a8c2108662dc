// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <map>
#include <string>
#include <vector>

namespace rille::engine {

/// Every value of a YAML text by its path, items of lists by their `name` where they have one:
/// "mask.openings.line.cd" -> "60 nm". Empty for a text that is no YAML.
std::map<std::string, std::string> case_values(const std::string& yaml);

/// A value in which cases differ; empty text where a case has none.
struct CaseDifference {
    std::string path;
    std::vector<std::string> values; ///< one a case
};
/// In order of paths; where whole branches differ each of their values counts.
std::vector<CaseDifference>
case_differences(const std::vector<std::map<std::string, std::string>>& cases);

} // namespace rille::engine
