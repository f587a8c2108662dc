// SPDX-License-Identifier: Apache-2.0
#include "engine/study/slurm_script.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

constexpr double slower_machines = 3; // a node may be slower, and busy, unlike this machine
constexpr double larger_memory = 1.5, program_mb = 100;
constexpr double start_up_s = 60;
constexpr long least_minutes = 2, collect_minutes = 30, collect_mb = 1000;

/// For the shell: in single quotes.
std::string quoted_word(const std::string& text) {
    std::string word = "'";
    for (const char c : text)
        word += c == '\'' ? std::string("'\\''") : std::string(1, c);
    return word + "'";
}

/// In names of log files a percent sign starts a pattern.
std::string in_log_names(const std::string& path) {
    std::string name;
    for (const char c : path)
        name += c == '%' ? std::string("%%") : std::string(1, c);
    return name;
}

std::string directive(const std::string& text) {
    return "#SBATCH " + text + "\n";
}

/// What both jobs say.
std::string head(const Study& study, const std::string& what, long minutes, long memory_mb,
                 const std::string& log) {
    const SlurmSettings& slurm = study.slurm;
    std::string text = "#!/bin/bash\n# " + what + ", written by rille study --slurm\n";
    text += directive("--job-name=rille");
    for (const auto& [option, value] :
         {std::pair<const char*, const std::string&>{"partition", slurm.partition},
          {"account", slurm.account},
          {"qos", slurm.qos},
          {"constraint", slurm.constraint}})
        if (!value.empty()) text += directive(fmt::format("--{}={}", option, quoted_word(value)));
    text += directive("--ntasks=1");
    text += directive(fmt::format("--time={}", minutes));
    text += directive(fmt::format("--mem={}M", memory_mb));
    text += directive("--open-mode=append");
    text += directive("--output=" + quoted_word(log));
    return text;
}

std::string own_lines(const Study& study) {
    std::string text;
    for (const std::string& line : study.slurm.lines)
        text += line + "\n";
    return text;
}

} // namespace

SlurmPlan slurm_plan(const Study& study, std::size_t points, double seconds_per_point,
                     double memory_mb, std::size_t longest_array) {
    const SlurmSettings& slurm = study.slurm;
    SlurmPlan plan;
    plan.points = points;
    plan.points_per_task = static_cast<std::size_t>(std::max(1, slurm.points_per_task));
    plan.workers =
        std::max(1, std::min(slurm.cpus_per_task, static_cast<int>(plan.points_per_task)));
    const double rounds = std::ceil(static_cast<double>(plan.points_per_task) / plan.workers);
    const double seconds = slurm.seconds_per_point.value_or(slower_machines * seconds_per_point);
    plan.minutes = std::max(least_minutes,
                            static_cast<long>(std::ceil(
                                (rounds * seconds + slurm.warn_before_kill_s + start_up_s) / 60)));
    plan.memory_mb = static_cast<long>(
        std::ceil(slurm.memory_mb.value_or(larger_memory * memory_mb * plan.workers + program_mb)));
    std::size_t tasks = (points + plan.points_per_task - 1) / plan.points_per_task;
    for (const std::size_t most = std::max<std::size_t>(1, longest_array); tasks > 0;) {
        plan.arrays.push_back(std::min(tasks, most));
        tasks -= plan.arrays.back();
    }
    return plan;
}

std::string slurm_array_script(const Study& study, const SlurmPlan& plan, const SlurmPaths& paths,
                               std::size_t first_task, std::size_t tasks) {
    const SlurmSettings& slurm = study.slurm;
    std::string text = head(study, "Points of a study", plan.minutes, plan.memory_mb,
                            in_log_names(paths.round) + "/task_%A_%a.log");
    const std::string throttle =
        slurm.at_most_tasks > 0 ? fmt::format("%{}", slurm.at_most_tasks) : "";
    text += directive(fmt::format("--array=0-{}{}", tasks - 1, throttle));
    text += directive(fmt::format("--cpus-per-task={}", std::max(1, slurm.cpus_per_task)));
    // The warning goes to this script, whose place the program takes below: it saves and ends.
    if (slurm.warn_before_kill_s > 0)
        text += directive(fmt::format("--signal=B:TERM@{:.0f}", slurm.warn_before_kill_s));
    text += own_lines(study);
    return text + fmt::format("exec {} study-task {} {} $(({} + SLURM_ARRAY_TASK_ID)) "
                              "--points-per-task {} --workers {}\n",
                              quoted_word(paths.program), quoted_word(paths.folder),
                              quoted_word(paths.round), first_task, plan.points_per_task,
                              std::max(1, slurm.cpus_per_task));
}

std::string slurm_collect_script(const Study& study, const SlurmPlan&, const SlurmPaths& paths) {
    std::string text = head(study, "Results of a study", collect_minutes, collect_mb,
                            in_log_names(paths.round) + "/collect.log");
    text += own_lines(study);
    return text + fmt::format("exec {} study-collect {} {}\n", quoted_word(paths.program),
                              quoted_word(paths.folder), quoted_word(paths.round));
}

} // namespace rille::engine
