// SPDX-License-Identifier: Apache-2.0
#include "engine/commands.hpp"

#include "engine/case_file.hpp"
#include "engine/case_schema.hpp"
#include "engine/console.hpp"
#include "engine/estimate.hpp"
#include "engine/grid_search.hpp"
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
    void surveyed(const SurfaceFlux& flux) override { output_.add_arc_data(flux); }
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

/// A run on the way into its folder.
struct Outing {
    OutputFolder& folder;
    const CommonOptions& options;
    const std::atomic<bool>& stop;
    GridSearch grids;
    Progress progress;
    std::string started = utc_now();
    /// Where the first main run is taken up, if it was stopped.
    std::optional<RunState> state = {};

    Outing(OutputFolder& into, const CommonOptions& common, const std::atomic<bool>& stopped,
           GridSearch search)
        : folder(into), options(common), stop(stopped), grids(std::move(search)),
          progress(std::cerr, Progress::style_for(STDERR_FILENO, common.quiet)) {}

    /// How companions show; the evidence is kept after each.
    GridWatch watch() {
        GridWatch told;
        told.progressed = [this](const std::string& words, double share) {
            ProgressState now;
            now.share = share;
            now.words = words;
            progress.update(now);
        };
        told.noted = [this](const std::string& line) { progress.note(line); };
        told.save = [this](const std::string& text) { folder.write(output_names::grids, text); };
        return told;
    }
};

struct MainRun {
    RunResult result;
    Metrics metrics;
};

/// One main run with everything that is told and written on the way.
MainRun run_main(Outing& outing, const GridSearch::Next& next) {
    const Case& the_case = next.the_case;
    const bool goes_on = outing.state.has_value();
    RunOutput output(outing.folder, the_case,
                     goes_on ? outing.state->frames : std::vector<SeriesEntry>());
    output.compare_with(outing.grids);
    RunWatcher watcher(output, outing.progress, outing.stop);
    MainRun run;
    run.result = goes_on ? resume_case(the_case, *outing.state, watcher, outing.stop)
                         : run_case(the_case, watcher, outing.stop);
    outing.state.reset();
    outing.progress.finish();
    run.result.record.command = outing.options.command_line;
    run.result.record.threads = threads_in_use(outing.options);
    run.result.record.started = outing.started;
    outing.folder.note(output_names::report); // written last, and the record lists it
    if (run.result.record.status != "interrupted") {
        outing.grids.add(next, measure(the_case, run.result.last), run.result.record.failure,
                         run.result.record.wall_seconds);
        run.result.record.accuracy = outing.grids.summary();
        if (outing.grids.compares()) outing.watch().save(outing.grids.text());
    }
    run.metrics = output.finish(run.result);
    return run;
}

/// Companions and main runs until the search is at its end; the exit status.
int follow(Outing& outing) {
    for (;;) {
        const std::optional<GridSearch::Next> next =
            run_companions(outing.grids, outing.watch(), outing.stop);
        if (!next) {
            outing.progress.finish();
            if (!outing.options.quiet)
                std::cout << "stopped among the grids that bound the error; rille resume "
                          << outing.folder.path() << " goes on\n";
            return interrupted_status;
        }
        const MainRun run = run_main(outing, *next);
        const RunRecord& record = run.result.record;
        const bool is_last = record.status == "interrupted" || run.result.error ||
                             outing.grids.next().kind == GridSearch::Next::Kind::end;
        if (!is_last) {
            outing.progress.note("the CDs are not as sure as asked yet: a finer grid follows");
            continue;
        }
        write_run_report(outing.folder, next->the_case);
        if (outing.options.json)
            std::cout << metrics_json(next->the_case, run.metrics).dump(2) << '\n';
        else if (!outing.options.quiet)
            std::cout << closing_text(next->the_case, record, run.metrics, outing.folder.path());
        if (run.result.error) std::rethrow_exception(run.result.error);
        if (record.status == "interrupted") return interrupted_status;
        const bool all =
            outing.grids.is_met() && (!outing.options.require_targets || all_met(run.metrics));
        return all ? 0 : goal_not_met_status;
    }
}

} // namespace

int run_command(const std::string& case_path, const std::string& folder, bool force,
                const CommonOptions& options, const std::atomic<bool>& stop) {
    const Case the_case = load(case_path, options);
    OutputFolder out(folder,
                     force ? OutputFolder::Existing::force : OutputFolder::Existing::refuse);
    Outing outing(out, options, stop, GridSearch(the_case));
    if (outing.grids.compares()) RunOutput(out, the_case); // what a stopped search is taken up from
    return follow(outing);
}

int resume_command(const std::string& folder, const CommonOptions& options,
                   const std::atomic<bool>& stop) {
    namespace fs = std::filesystem;
    const std::string path = (fs::path(folder) / output_names::state).string();
    OutputFolder out(folder, OutputFolder::Existing::keep);
    const std::string grids = (fs::path(folder) / output_names::grids).string();
    const bool has_state = fs::exists(path), has_grids = fs::exists(grids);
    const auto nothing_to_do = [&] {
        return OutputError(folder, "cannot take up the run",
                           "no saved state is here; the run came to its end, or has yet to begin");
    };
    if (!has_state && !has_grids) throw nothing_to_do();
    const Case the_case = load((fs::path(folder) / output_names::resolved_case).string(), options);
    Outing outing(out, options, stop,
                  GridSearch(the_case, has_grids ? read_file(grids) : "", grids));
    if (!has_state && outing.grids.next().kind == GridSearch::Next::Kind::end)
        throw nothing_to_do();
    if (has_state) outing.state = read_state(the_case, read_file(path), path);
    return follow(outing);
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
    Metrics metrics = measure(the_case, read_vtp(the_case, run.frames.back()),
                              measured_after(the_case, run.frames, run.record), !run.is_stopped());
    const std::string grids = (fs::path(folder) / output_names::grids).string();
    if (fs::exists(grids)) GridSearch(the_case, read_file(grids), grids).assess(the_case, metrics);
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
