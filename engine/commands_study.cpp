// SPDX-License-Identifier: Apache-2.0
#include "engine/commands.hpp"

#include "engine/console.hpp"
#include "engine/study/local_study.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/point_record.hpp"
#include "engine/study/study_cost.hpp"
#include "engine/study/study_folder.hpp"
#include "engine/study/worker.hpp"
#include "engine/study_ending.hpp"

#include <algorithm>
#include <filesystem>
#include <fmt/format.h>
#include <iostream>
#include <thread>
#include <unistd.h>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

/// Points in the order of the plan.
std::function<std::optional<std::size_t>()> all_points(std::size_t points) {
    return [points, next = std::size_t(0)]() mutable {
        return next < points ? std::optional(next++) : std::nullopt;
    };
}

/// Runs whatever is missing on this machine; false if it was told to stop.
bool run_here(const std::string& folder, const Study& study, const LocalSettings& settings,
              const CommonOptions& options, const std::atomic<bool>& stop) {
    const auto before = static_cast<double>(count_finished_points(folder));
    const auto all = static_cast<double>(std::max<std::size_t>(1, study.points));
    Progress progress(std::cerr, Progress::style_for(STDERR_FILENO, options.quiet));
    LocalWatch watch;
    watch.noted = [&](const std::string& text) { progress.note(text); };
    watch.progressed = [&](double points) {
        ProgressState state;
        state.share = (before + points) / all;
        state.share_before = before / all;
        state.words = fmt::format("{:.0f} of {} points", std::floor(before + points), study.points);
        progress.update(state);
    };
    const bool ended = run_points(folder, study, all_points(study.points), settings, watch, stop);
    progress.finish();
    clear_ended_points(folder); // of workers whose parent was killed, and that another start ended
    return ended;
}

/// Removes the points of those statuses, so that they are done again.
void forget(const std::string& folder, const Study& study, const std::vector<std::string>& retry) {
    if (retry.empty()) return;
    for (std::size_t index = 0; index < study.points; ++index) {
        const std::string name = point_name(study, index);
        if (!PointFolder::is_finished(folder, name)) continue;
        if (std::find(retry.begin(), retry.end(), point_status(folder, name)) != retry.end())
            fs::remove_all(PointFolder::final_path(folder, name));
    }
}

} // namespace

int study_command(const std::string& file, const StudyOptions& chosen, const CommonOptions& options,
                  const std::atomic<bool>& stop) {
    const Study study = load_study(file, options.overrides);
    LocalSettings settings =
        local_settings(chosen.workers, options.threads,
                       static_cast<int>(std::thread::hardware_concurrency()), study.points);
    settings.retries_killed = study.slurm.retries_killed;
    const StudySources sources = study_sources(study);
    if (!chosen.plan_only) prepare_study_folder(chosen.folder, study, sources, chosen.force);
    if (chosen.plan_only || (!options.quiet && !options.json))
        std::cout << plan_text(study)
                  << study_cost_text(study, study_cost(study, settings.threads), settings.workers)
                  << std::flush;
    if (chosen.plan_only) return 0;
    forget(chosen.folder, study, chosen.retry);
    if (chosen.slurm) return submit_study(chosen.folder, study, options);
    clear_ended_points(chosen.folder);
    const bool ended = chosen.collect || run_here(chosen.folder, study, settings, options, stop);
    return conclude_study(chosen.folder, study, options, !ended);
}

int study_worker_command(const std::string& folder, int threads, std::atomic<bool>& stop) {
    return serve_study(folder, threads, stop);
}

} // namespace rille::engine
