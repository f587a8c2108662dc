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
/// Measures the last state that a run left in `folder` again, under the case kept there with the
/// overrides given (`--set measure.cd.top=...`).
int measure_command(const std::string& folder, const CommonOptions&);
/// Writes report.html into the folder of a run again; with `figures` also every figure as SVG and
/// as PNG of 1920 x 1080 px into its folder `figures`.
int report_command(const std::vector<std::string>& folders, bool figures, const CommonOptions&);
int schema_command();

} // namespace rille::engine
