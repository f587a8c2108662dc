// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/history.hpp"
#include "engine/metric.hpp"
#include "engine/run_record.hpp"
#include "engine/vtk_files.hpp"

#include <string>
#include <vector>

namespace rille::engine {

struct Case;

/// A run that was stopped, as it lies in its folder.
struct RunState {
    std::string simulation;          ///< as Simulation::save gives it
    std::vector<HistoryRow> history; ///< up to there
    std::vector<StepMetrics> after;  ///< at the ends of the steps that targets name
    double next_frame_s = 0;         ///< time of the next frame [s]
    std::vector<SeriesEntry> frames; ///< written so far
    double wall_seconds = 0;         ///< spent so far
    std::string program;             ///< version, revision and build that wrote it
    int resumed = 0;                 ///< how often the run was taken up before
};

/// The state as a file: with the hash of the case and of itself.
std::string state_text(const Case&, const RunState&);
/// Reads it back. Throws OutputError (with `path`) for anything that is not the whole state of this
/// case.
RunState read_state(const Case&, const std::string& text, const std::string& path);
/// Version, revision and build of this program, as a state names them.
std::string this_program();
/// Of the case with the files that it names.
std::string case_hash(const Case&);

} // namespace rille::engine
