// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/study.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// Everything that the points of a study follow from, as texts: what its folder keeps.
struct StudySources {
    std::string study_yaml;             ///< names base/case.yaml and inputs/...
    std::string base_yaml;              ///< the base case as written, but for the names of files
    std::vector<InputFile> base_inputs; ///< named "inputs/analyser.csv" from the base case
    std::vector<InputFile> inputs;      ///< tables of the study itself
    /// SHA-256 of the base case, its files, and the values of every point: what makes the points
    /// of two studies the same. Title, answer, `keep` and the settings of a cluster are not in it.
    std::string hash;
};

StudySources study_sources(const Study&);

} // namespace rille::engine
