// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstdint>
#include <nlohmann/json_fwd.hpp>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;

/// How a recipe step ended.
struct StepOutcome {
    std::string name;
    double start_s = 0; ///< since the start of the run
    double end_s = 0;
    std::string reason; ///< "time", "reached stop at trench centre", "did not reach ... in 150 s"
};

struct PhaseTime {
    std::string name; ///< "ions", "neutrals", "kinetics", "advance", ...
    double seconds = 0;
};

/// Where a result comes from and how the computation went. Everything that is not known stays
/// empty.
struct RunRecord {
    std::string status = "done"; ///< "done", "not cleared", "interrupted", "failed"
    std::string failure;         ///< why the run could not go on; empty unless "failed"
    std::string command;
    int threads = 0;
    std::string started; ///< UTC, 2026-01-31T12:00:00Z
    double wall_seconds = 0;
    std::vector<PhaseTime> timings;
    std::vector<StepOutcome> steps;
    std::string accuracy;              ///< what a search for a grid came to; empty without one
    std::vector<std::string> warnings; ///< raised during the run; the case's own are added
    double simulated_s = 0;
    int resumed = 0;                      ///< how often the run was taken up after a stop
    int refreshes = 0;                    ///< of the arrivals
    std::string computed;                 ///< what of the period was computed, mirrored to the rest
    std::size_t elements = 0, voxels = 0; ///< of the front that was computed, at the end
    std::uint64_t rays = 0;
    std::uint64_t lost_rays = 0;
    double redistance_shift = 0; ///< [cells] largest accumulated
    std::uint64_t peak_memory_bytes = 0;
};

/// Whether a run of that status went through its whole recipe: "done", "not cleared".
bool is_at_its_end(const std::string& status);

/// run.json. `files` is what the folder holds.
nlohmann::json record_json(const Case&, const RunRecord&, const std::vector<std::string>& files);

/// Instruction sets of this processor that the C library may choose its routines by, as the
/// processor names them: results of the same binary agree bit for bit only where these agree.
std::vector<std::string> cpu_features();
/// SHA-256 of the text, 64 hexadecimal digits.
std::string content_hash(const std::string& text);
std::uint64_t peak_memory_bytes(); ///< of this process so far; 0 if unknown
/// "measured", "published", "from memory", "illustrative" with their counts:
/// "parameters: 0 measured, 12 published, 5 from memory, 3 illustrative".
std::string standing_line(const Case&);

} // namespace rille::engine
