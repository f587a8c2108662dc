// SPDX-License-Identifier: Apache-2.0
#include "engine/commands.hpp"

#include "engine/case_file.hpp"
#include "engine/case_schema.hpp"
#include "engine/console.hpp"
#include "engine/estimate.hpp"
#include "engine/metrics.hpp"
#include "engine/output_names.hpp"
#include "engine/problems.hpp"
#include "engine/report/run_page.hpp"
#include "engine/run.hpp"
#include "engine/run_output.hpp"
#include "engine/sheath_output.hpp"
#include "engine/study/study_schema.hpp"

#include <algorithm>
#include <chrono>
#include <ctime>
#include <filesystem>
#include <iostream>
#include <nlohmann/json.hpp>
#include <thread>
#include <unistd.h>

namespace rille::engine {
namespace {

/// The seed is one more override, so that the resolved case says what was run.
Case load(const std::string& path, const CommonOptions& options) {
    std::vector<std::string> overrides = options.overrides;
    if (options.seed) overrides.push_back("sampling.seed=" + std::to_string(*options.seed));
    return load_case(path, overrides);
}

/// Only what is measured may differ from the run: throws InputError for other overrides.
void check_measure_overrides(const std::vector<std::string>& overrides) {
    Problems problems;
    for (const std::string& text : overrides)
        if (text.rfind("measure", 0) != 0 && text.rfind("targets", 0) != 0)
            problems.add({"--set " + text, 0, 0}, "",
                         "a finished run can be measured differently, not run differently: "
                         "measure.*, measured.* and targets.* are allowed");
    problems.throw_if_any();
}

std::string utc_now() {
    const std::time_t now = std::chrono::system_clock::to_time_t(std::chrono::system_clock::now());
    std::tm parts{};
    gmtime_r(&now, &parts);
    char text[32];
    std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &parts);
    return text;
}

/// Shows progress and writes frames as they come.
class RunWatcher : public RunObserver {
public:
    RunWatcher(RunOutput& output, Progress& progress, const std::atomic<bool>& stop)
        : output_(output), progress_(progress), stop_(stop) {}
    void progressed(const Simulation&, const HistoryRow& row, double share) override {
        ProgressState state;
        state.share = share;
        state.time_s = row.time_s;
        state.step = row.step;
        if (!row.features.empty()) state.depth_nm = row.features.front().depth_centre;
        progress_.update(state);
    }
    void framed(const SurfaceState& state) override { output_.add_frame(state); }
    void warned(const std::string& text) override { progress_.note("warning: " + text); }
    /// With each frame, at least twice a minute, and when the run is told to stop.
    void resumable(bool frame_due, const std::function<RunState()>& state) override {
        const auto now = Clock::now();
        if (!frame_due && !stop_ && now - saved_ < std::chrono::seconds(30)) return;
        output_.save(state());
        saved_ = now;
    }

private:
    using Clock = std::chrono::steady_clock;
    RunOutput& output_;
    Progress& progress_;
    const std::atomic<bool>& stop_;
    Clock::time_point saved_;
};

/// The frames in a run's folder. Throws OutputError if there is none.
std::vector<std::string> some_frames(const std::string& folder) {
    std::vector<std::string> frames = frame_files(folder);
    if (frames.empty())
        throw OutputError(folder, "looking for the frames of a run", "there are none here");
    return frames;
}

int threads_in_use(const CommonOptions& options) {
    return options.threads > 0 ? options.threads
                               : static_cast<int>(std::thread::hardware_concurrency());
}

bool all_met(const Metrics& metrics) {
    return std::all_of(metrics.targets.begin(), metrics.targets.end(),
                       [](const TargetVerdict& v) { return v.verdict == Verdict::met; });
}

/// Runs to the end with everything that is told and written on the way; the exit status.
int follow(const Case& the_case, OutputFolder& folder, RunOutput& output,
           const CommonOptions& options, const std::atomic<bool>& stop,
           const std::function<RunResult(RunObserver&)>& go) {
    const std::string started = utc_now();
    Progress progress(std::cerr, Progress::style_for(STDERR_FILENO, options.quiet));
    RunWatcher watcher(output, progress, stop);
    RunResult result = go(watcher);
    progress.finish();
    result.record.command = options.command_line;
    result.record.threads = threads_in_use(options);
    result.record.started = started;
    folder.note(output_names::report); // written last, and the record lists it
    const Metrics metrics = output.finish(result);
    write_run_report(folder, the_case);
    if (options.json)
        std::cout << metrics_json(the_case, metrics).dump(2) << '\n';
    else if (!options.quiet)
        std::cout << closing_text(the_case, result.record, metrics, folder.path());
    if (result.error) std::rethrow_exception(result.error);
    if (result.record.status == "interrupted") return interrupted_status;
    return options.require_targets && !all_met(metrics) ? goal_not_met_status : 0;
}

} // namespace

int run_command(const std::string& case_path, const std::string& folder, bool force,
                const CommonOptions& options, const std::atomic<bool>& stop) {
    const Case the_case = load(case_path, options);
    OutputFolder out(folder,
                     force ? OutputFolder::Existing::force : OutputFolder::Existing::refuse);
    RunOutput output(out, the_case);
    return follow(the_case, out, output, options, stop,
                  [&](RunObserver& watcher) { return run_case(the_case, watcher, stop); });
}

int resume_command(const std::string& folder, const CommonOptions& options,
                   const std::atomic<bool>& stop) {
    namespace fs = std::filesystem;
    const std::string path = (fs::path(folder) / output_names::state).string();
    OutputFolder out(folder, OutputFolder::Existing::keep);
    if (!fs::exists(path))
        throw OutputError(folder, "cannot take up the run",
                          "no saved state is here; the run came to its end, or has yet to begin");
    const Case the_case = load((fs::path(folder) / output_names::resolved_case).string(), options);
    const RunState state = read_state(the_case, read_file(path), path);
    RunOutput output(out, the_case, state.frames);
    return follow(the_case, out, output, options, stop, [&](RunObserver& watcher) {
        return resume_case(the_case, state, watcher, stop);
    });
}

int check_command(const std::string& case_path, const CommonOptions& options) {
    const Case the_case = load(case_path, options);
    const Estimate estimate = estimate_run(the_case);
    if (options.json) {
        std::cout << estimate_json(the_case, estimate).dump(2) << '\n';
        return 0;
    }
    std::cout << the_case.shown_yaml << '\n' << estimate_text(the_case, estimate);
    return 0;
}

int sheath_command(const std::string& case_path, const std::string& folder, bool force,
                   const CommonOptions& options) {
    const Case the_case = load(case_path, options);
    if (!folder.empty()) {
        OutputFolder out(folder,
                         force ? OutputFolder::Existing::force : OutputFolder::Existing::refuse);
        write_sheath(out, the_case, true);
    }
    if (options.json)
        std::cout << sheath_json(the_case).dump(2) << '\n';
    else if (!options.quiet)
        std::cout << sheath_table(the_case)
                  << (folder.empty() ? "" : "written into " + folder + "\n");
    return 0;
}

int measure_command(const std::string& folder, const CommonOptions& options) {
    namespace fs = std::filesystem;
    check_measure_overrides(options.overrides);
    const Case the_case = load((fs::path(folder) / output_names::resolved_case).string(), options);
    RunFolder run;
    run.path = folder;
    run.frames = some_frames(folder);
    run.record = run_record(folder);
    run.can_be_resumed = fs::exists(fs::path(folder) / output_names::state);
    const Metrics metrics =
        measure(the_case, read_vtp(the_case, run.frames.back()),
                measured_after(the_case, run.frames, run.record), !run.is_stopped());
    if (options.json)
        std::cout << metrics_json(the_case, metrics).dump(2) << '\n';
    else
        std::cout << metrics_table(the_case, metrics);
    return 0;
}

int schema_command(bool of_study) {
    std::cout << (of_study ? study_json_schema() : json_schema()) << '\n';
    return 0;
}

} // namespace rille::engine
