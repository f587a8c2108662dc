// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

namespace rille::engine {

void build_chemistry(const Entry& root, const std::string&, Case& result, Problems&) {
    result.chemistry = root["chemistry"].text;
}

} // namespace rille::engine
