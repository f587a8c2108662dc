// SPDX-License-Identifier: Apache-2.0
#include "engine/commands.hpp"

#include "engine/case_file.hpp"
#include "engine/case_schema.hpp"
#include "engine/console.hpp"
#include "engine/estimate.hpp"
#include "engine/metrics.hpp"
#include "engine/output_names.hpp"
#include "engine/run.hpp"
#include "engine/run_output.hpp"

#include <chrono>
#include <ctime>
#include <filesystem>
#include <iostream>
#include <nlohmann/json.hpp>
#include <thread>
#include <unistd.h>

namespace rille::engine {
namespace {

Case load(const std::string& path, const CommonOptions& options) {
    Case the_case = load_case(path, options.overrides);
    if (options.seed) the_case.seed = *options.seed;
    return the_case;
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
    RunWatcher(RunOutput& output, Progress& progress) : output_(output), progress_(progress) {}
    void progressed(const Simulation&, const HistoryRow& row, double share) override {
        ProgressState state;
        state.share = share;
        state.time_s = row.time_s;
        state.step = row.step;
        if (!row.features.empty()) state.depth_nm = row.features.front().depth_centre;
        progress_.update(state);
    }
    void framed(const SurfaceState& state) override { output_.add_frame(state); }

private:
    RunOutput& output_;
    Progress& progress_;
};

/// The latest frame in a run's folder. Throws OutputError if there is none.
std::string last_frame(const std::string& folder) {
    const std::filesystem::path frames = std::filesystem::path(folder) / output_names::frames;
    std::string last;
    std::error_code missing;
    for (const auto& entry : std::filesystem::directory_iterator(frames, missing))
        if (entry.path().extension() == ".vtp") last = std::max(last, entry.path().string());
    if (last.empty()) throw OutputError(frames.string(), "looking for frames", "none found");
    return last;
}

int threads_in_use(const CommonOptions& options) {
    return options.threads > 0 ? options.threads
                               : static_cast<int>(std::thread::hardware_concurrency());
}

} // namespace

int run_command(const std::string& case_path, const std::string& folder, bool force,
                const CommonOptions& options, const std::atomic<bool>& stop) {
    const Case the_case = load(case_path, options);
    OutputFolder out(folder,
                     force ? OutputFolder::Existing::force : OutputFolder::Existing::refuse);
    for (const std::string& warning : the_case.warnings)
        if (!options.quiet) std::cerr << "warning: " << warning << '\n';
    const std::string started = utc_now();
    RunOutput output(out, the_case);
    Progress progress(std::cerr, Progress::style_for(STDERR_FILENO, options.quiet));
    RunWatcher watcher(output, progress);
    RunResult result = run_case(the_case, watcher, stop);
    progress.finish();
    result.record.command = options.command_line;
    result.record.threads = threads_in_use(options);
    result.record.started = started;
    const Metrics metrics = output.finish(result);
    if (options.json)
        std::cout << metrics_json(the_case, metrics).dump(2) << '\n';
    else if (!options.quiet)
        std::cout << closing_text(the_case, result.record, metrics, folder);
    if (result.error) std::rethrow_exception(result.error);
    return 0;
}

int check_command(const std::string& case_path, const CommonOptions& options) {
    const Case the_case = load(case_path, options);
    const Estimate estimate = estimate_run(the_case);
    if (options.json) {
        std::cout << estimate_json(the_case, estimate).dump(2) << '\n';
        return 0;
    }
    std::cout << the_case.resolved_yaml << '\n' << estimate_text(the_case, estimate);
    for (const std::string& warning : the_case.warnings)
        std::cout << "warning: " << warning << '\n';
    for (const std::string& warning : charging_warnings(the_case))
        std::cout << "warning: " << warning << '\n';
    return 0;
}

int measure_command(const std::string& folder, const CommonOptions& options) {
    namespace fs = std::filesystem;
    const Case the_case = load((fs::path(folder) / output_names::resolved_case).string(), options);
    const SurfaceState last = read_vtp(the_case, last_frame(folder));
    const Metrics metrics = measure(the_case, last);
    if (options.json)
        std::cout << metrics_json(the_case, metrics).dump(2) << '\n';
    else
        std::cout << metrics_table(the_case, metrics);
    return 0;
}

int schema_command() {
    std::cout << json_schema() << '\n';
    return 0;
}

} // namespace rille::engine
