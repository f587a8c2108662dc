// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <atomic>
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// What run_command returns when it was stopped before its end.
constexpr int interrupted_status = 130;

/// What run_command and resume_command return when targets are required and not all are met.
constexpr int goal_not_met_status = 6;

/// What every command understands.
struct CommonOptions {
    std::vector<std::string> overrides; ///< "key.path=value"
    std::optional<std::uint64_t> seed;
    int threads = 0; ///< 0 = all cores
    bool quiet = false;
    bool json = false;
    bool require_targets = false; ///< a target that is not met is goal_not_met_status
    std::string command_line;     ///< as typed, for the record
};

/// Each command returns its exit status and throws InputError, OutputError, NumericsError.
int run_command(const std::string& case_path, const std::string& folder, bool force,
                const CommonOptions&, const std::atomic<bool>& stop);
/// Takes up the run that was stopped in `folder`.
int resume_command(const std::string& folder, const CommonOptions&, const std::atomic<bool>& stop);
int check_command(const std::string& case_path, const CommonOptions&);
/// Prints what reaches the wafer in every plasma of a case; writes tables and the picture into
/// `folder` unless it is empty.
int sheath_command(const std::string& case_path, const std::string& folder, bool force,
                   const CommonOptions&);
/// Evaluates arrivals and rates on the surface with which a case starts, without moving it, under
/// the plasma named (empty: that of the first step); writes tables and a picture into `folder`.
int flux_command(const std::string& case_path, const std::string& plasma, const std::string& folder,
                 bool force, const CommonOptions&);
/// Measures the last state that a run left in `folder` again, under the case kept there with the
/// overrides given (`--set measure.cd.top=...`).
int measure_command(const std::string& folder, const CommonOptions&);
/// Writes report.html into the folder of a run or a study again; of several runs one that shows
/// them side by side into the folder `place`. With `figures` also every figure as SVG and as PNG of
/// 1920 x 1080 px into the folder `figures` beside it.
int report_command(const std::vector<std::string>& folders, const std::string& place, bool figures,
                   const CommonOptions&);
/// The JSON Schema of a case file, or of a study file.
int schema_command(bool of_study);

/// What `rille study` understands beside the common options.
struct StudyOptions {
    std::string folder = "study";
    int workers = 0; ///< 0 = as many as cores allow
    bool plan_only = false;
    bool force = false;
    bool slurm = false;             ///< hand the points to a cluster
    bool collect = false;           ///< only put together what is there
    std::vector<std::string> retry; ///< statuses of points that are done again: "failed", "killed"
};
/// Some points of a study have failed, were killed, or are missing.
constexpr int incomplete_status = 4;

/// Runs what is missing of a study, and writes results, charts and report. `stop` ends it with what
/// there is.
int study_command(const std::string& file, const StudyOptions&, const CommonOptions&,
                  const std::atomic<bool>& stop);
/// A process that runs points for study_command; see engine/study/worker.hpp.
int study_worker_command(const std::string& folder, int threads, std::atomic<bool>& stop);

/// One task of a job array.
struct StudyTask {
    std::string round; ///< folder of the round of submission
    std::size_t task = 0, points_per_task = 1;
    int workers = 1;
};
int study_task_command(const std::string& folder, const StudyTask&, const CommonOptions&,
                       const std::atomic<bool>& stop);
/// The job after all tasks of a round: submits once more what was killed, and puts the results
/// together.
int study_collect_command(const std::string& folder, const std::string& round);

} // namespace rille::engine
