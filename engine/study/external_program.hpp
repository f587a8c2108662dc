// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::engine {

/// What another program has printed, and how it ended.
struct ProgramEnd {
    int status = 0; ///< 127 where it could not be started
    std::string output;
    std::string errors;
};
/// Runs a program that is found along PATH, without a shell, and waits for its end.
ProgramEnd run_program(const std::vector<std::string>& words);

} // namespace rille::engine
