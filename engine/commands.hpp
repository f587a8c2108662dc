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

/// What every command understands.
struct CommonOptions {
    std::vector<std::string> overrides; ///< "key.path=value"
    std::optional<std::uint64_t> seed;
    int threads = 0; ///< 0 = all cores
    bool quiet = false;
    bool json = false;
    std::string command_line; ///< as typed, for the record
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
/// Measures the last state that a run left in `folder` again, under the case kept there with the
/// overrides given (`--set measure.cd.top=...`).
int measure_command(const std::string& folder, const CommonOptions&);
int schema_command();

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
/// One task of a job array: the points of that task of a round of submission.
int study_task_command(const std::string& folder, const std::string& round, std::size_t task,
                       std::size_t points_per_task, int workers, const CommonOptions&,
                       const std::atomic<bool>& stop);
/// The job after all tasks of a round: submits once more what was killed, and puts the results
/// together.
int study_collect_command(const std::string& folder, const std::string& round);

} // namespace rille::engine
