// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/study_sources.hpp"

#include <nlohmann/json_fwd.hpp>
#include <string>

namespace rille::engine {

/// study.json: what the study is, which program made it, what its points follow from.
nlohmann::json study_manifest(const Study&, const StudySources&);

/// What is found where a study is to be written.
enum class StudyPlace {
    fresh, ///< nothing: the study begins
    known  ///< this very study, begun by this very program: it goes on
};

/// Looks at a folder, writing nothing. Throws OutputError for a folder that holds something else, a
/// study whose points differ, or one that another version of the program began.
StudyPlace look_at_study_folder(const std::string& folder, const StudySources&);

/// Makes the folder ready: proves that it can be written, and writes whatever is missing of the
/// study's own files. With `replace` everything that an earlier study left is removed first.
/// Nothing here is ever half written: a kill at any moment leaves a folder that can be gone on
/// with. Throws OutputError.
void prepare_study_folder(const std::string& folder, const Study&, const StudySources&,
                          bool replace);

/// Hash of the processor's features that the C library chooses its routines by: points agree bit
/// for bit where it agrees.
std::string cpu_features_hash();

} // namespace rille::engine
