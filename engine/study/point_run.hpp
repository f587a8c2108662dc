// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_output.hpp"
#include "engine/study/study.hpp"

#include <atomic>
#include <functional>
#include <string>

namespace rille::engine {

/// What a worker knows of its study; read once.
struct StudyAtWork {
    std::string folder;
    Study study;
    std::string base_text; ///< base/case.yaml
};
/// Reads a study from its folder, where it was checked before. Throws InputError, OutputError.
StudyAtWork open_study(const std::string& folder);

/// How an attempt on a point ended.
struct PointOutcome {
    enum class Kind {
        finished, ///< the point has its folder
        stopped,  ///< told to stop; it can be taken up
        lost      ///< its temporary folder was taken away; nothing is left of the attempt
    };
    Kind kind = Kind::finished;
    std::string status; ///< of a finished point
    double seconds = 0;
};

/// Runs one point and puts its folder in place. A point that is finished already is left alone.
/// Bad input and numerics are results ("failed"). Throws OutputError where the folder cannot be
/// written: then no point can.
/// `progress` is told the share of the run that is done, in [0, 1].
PointOutcome run_point(const StudyAtWork&, std::size_t index, int tries,
                       const std::atomic<bool>& stop, const std::function<void(double)>& progress);

/// Puts the folder of a point in place whose processes ended each time. Throws OutputError.
void record_killed_point(const std::string& folder, const Study&, std::size_t index, int tries,
                         const std::string& reason);

/// What parts of a run the list of a study leaves.
RunParts run_parts(const std::vector<StudyKeep::Part>&);

} // namespace rille::engine
