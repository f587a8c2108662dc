// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/local_study.hpp"
#include "engine/study/slurm_script.hpp"
#include "engine/study/study.hpp"

#include <functional>
#include <string>
#include <vector>

namespace rille::engine {

/// One submission of what is missing: DIR/slurm/0001 and so on, with points.txt, the scripts, their
/// logs and jobs.json.
struct SlurmRound {
    std::string folder;              ///< absolute
    int retry = 0;                   ///< how many rounds before it belong to the same request
    std::vector<std::string> arrays; ///< job numbers
    std::string collect;             ///< job number of the collection
    std::size_t points = 0, tasks = 0;
};

/// What became of a request.
struct SlurmAnswer {
    enum class Kind {
        submitted, ///< a new round
        under_way, ///< the last round has not ended; nothing was done
        complete   ///< nothing is missing
    };
    Kind kind = Kind::complete;
    SlurmRound round;
    std::size_t missing = 0; ///< points without result
};

/// Submits whatever is missing, unless the last round is still in the queue. `cost` is asked for
/// the seconds and the MB of one point only where the study names none. Throws OutputError where
/// Slurm's programs are not there or refuse.
SlurmAnswer submit_missing(const std::string& folder, const Study&,
                           const std::function<std::pair<double, double>()>& cost, int retry = 0);

/// Points of one task of a round, in the order of its list. Throws OutputError.
std::vector<std::size_t> points_of_task(const std::string& round, std::size_t task,
                                        std::size_t points_per_task);

/// After a round has ended: points whose tasks were killed are submitted once more, or recorded as
/// killed where that was done as often as the study allows. What a person has cancelled is left.
/// Returns a line that says what was done.
std::string look_after_round(const std::string& folder, const Study&, const std::string& round,
                             const std::function<std::pair<double, double>()>& cost);

} // namespace rille::engine
