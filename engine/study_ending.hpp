// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/commands.hpp"
#include "engine/study/study.hpp"

#include <string>

namespace rille::engine {

/// Everything that is made from the table of a study's results: effects, the curve that was asked
/// for, the report. The folder holds results.csv already.
void write_study_pages(const std::string& folder, const Study&);

/// Puts the results of a study together, writes its pages, and says how it stands and what to do
/// next. Returns the exit status; `stopped`: the study was told to stop before its end.
int conclude_study(const std::string& folder, const Study&, const CommonOptions&, bool stopped);

/// Hands what is missing to a Slurm cluster, or puts together what it has brought.
int submit_study(const std::string& folder, const Study&, const CommonOptions&);

} // namespace rille::engine
