// SPDX-License-Identifier: Apache-2.0
// What a study does with a Slurm cluster: submission, and the two commands that its jobs run.
#include "engine/commands.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/local_study.hpp"
#include "engine/study/point_run.hpp"
#include "engine/study/slurm_study.hpp"
#include "engine/study/study_cost.hpp"
#include "engine/study_ending.hpp"

#include <fmt/format.h>
#include <iostream>

namespace rille::engine {
namespace {

std::function<std::pair<double, double>()> cost_of(const Study& study) {
    return [&study] {
        const StudyCost cost = study_cost(study, 1);
        return std::pair(cost.seconds_per_point, cost.memory_mb);
    };
}

std::string jobs_text(const SlurmRound& round) {
    std::string text;
    for (const std::string& job : round.arrays)
        text += (text.empty() ? "" : ", ") + job;
    return text;
}

} // namespace

int submit_study(const std::string& folder, const Study& study, const CommonOptions& options) {
    const SlurmAnswer answer = submit_missing(folder, study, cost_of(study));
    if (answer.kind == SlurmAnswer::Kind::complete)
        return conclude_study(folder, study, options, false);
    if (options.quiet) return 0;
    const std::string jobs = jobs_text(answer.round);
    if (answer.kind == SlurmAnswer::Kind::submitted)
        std::cout << fmt::format("submitted {} points in {} tasks: job {}, then {} puts the "
                                 "results together\n",
                                 answer.round.points, answer.round.tasks, jobs,
                                 answer.round.collect);
    else
        std::cout << fmt::format("job {} is still in the queue; {} of {} points are missing\n",
                                 jobs, answer.missing, study.points);
    std::cout << "scripts and logs in " << answer.round.folder
              << "\nthe same command with --collect instead of --slurm shows what is there\n";
    return 0;
}

int study_task_command(const std::string& folder, const StudyTask& task,
                       const CommonOptions& options, const std::atomic<bool>& stop) {
    const StudyAtWork work = open_study(folder);
    const std::vector<std::size_t> points =
        points_of_task(task.round, task.task, task.points_per_task);
    LocalSettings settings =
        local_settings(task.workers, options.threads, task.workers, points.size());
    settings.retries_killed = work.study.slurm.retries_killed;
    LocalWatch watch;
    watch.noted = [](const std::string& text) { std::cout << text << std::endl; };
    const auto next = [&points, at = std::size_t(0)]() mutable {
        return at < points.size() ? std::optional(points[at++]) : std::nullopt;
    };
    const bool ended = run_points(work.folder, work.study, next, settings, watch, stop);
    std::cout << fmt::format("task {}: {} points {}\n", task.task, points.size(),
                             ended ? "ended" : "were stopped before their end");
    return ended ? 0 : interrupted_status;
}

int study_collect_command(const std::string& folder, const std::string& round) {
    const StudyAtWork work = open_study(folder);
    try {
        std::cout << look_after_round(work.folder, work.study, round, cost_of(work.study))
                  << std::endl;
    } catch (const OutputError& error) { // some clusters let no job submit others
        std::cout << error.what() << "\nwhat is missing was not submitted again" << std::endl;
    }
    CommonOptions options;
    return conclude_study(work.folder, work.study, options, false);
}

} // namespace rille::engine
