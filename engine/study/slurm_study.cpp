// SPDX-License-Identifier: Apache-2.0
#include "engine/study/slurm_study.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/external_program.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/point_run.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <cstdlib>
#include <filesystem>
#include <fmt/format.h>
#include <nlohmann/json.hpp>
#include <optional>
#include <sstream>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using nlohmann::json;

constexpr const char* list_name = "points.txt";
constexpr const char* jobs_name = "jobs.json";
constexpr std::size_t default_array = 1001; // Slurm's own where a cluster does not say

std::string trimmed_end(std::string text) {
    while (!text.empty() && (text.back() == '\n' || text.back() == ' '))
        text.pop_back();
    return text;
}

/// Runs one of Slurm's programs; throws where it is not there or refuses.
std::string slurm(const std::vector<std::string>& words) {
    const ProgramEnd end = run_program(words);
    if (end.status == 0) return end.output;
    const std::string errors = trimmed_end(end.errors);
    throw OutputError(words[0],
                      end.status == 127 ? "cannot be started; is this a machine of a Slurm cluster?"
                                        : "has refused",
                      errors.empty() ? fmt::format("status {}", end.status) : errors);
}

std::size_t longest_array() {
    std::istringstream lines(slurm({"scontrol", "show", "config"}));
    for (std::string line; std::getline(lines, line);)
        if (line.rfind("MaxArraySize", 0) == 0) {
            const std::size_t equals = line.find('=');
            if (equals == std::string::npos) break;
            return std::strtoull(line.c_str() + equals + 1, nullptr, 10);
        }
    return default_array;
}

std::vector<std::string> rounds_of(const std::string& folder) {
    std::vector<std::string> rounds;
    std::error_code none;
    for (const auto& entry : fs::directory_iterator(fs::path(folder) / study_names::slurm, none))
        if (fs::exists(entry.path() / jobs_name)) rounds.push_back(entry.path().string());
    std::sort(rounds.begin(), rounds.end());
    return rounds;
}

SlurmRound read_round(const std::string& path) {
    const std::string file = (fs::path(path) / jobs_name).string();
    try {
        const json in = json::parse(read_file(file));
        SlurmRound round;
        round.folder = path;
        in.at("retry").get_to(round.retry);
        in.at("arrays").get_to(round.arrays);
        in.at("collect").get_to(round.collect);
        in.at("points").get_to(round.points);
        in.at("tasks").get_to(round.tasks);
        return round;
    } catch (const json::exception& error) {
        throw OutputError(file, "cannot read the jobs of a study", error.what());
    }
}

void write_round(OutputFolder& out, const SlurmRound& round) {
    out.write(jobs_name, json{{"format", 1},
                              {"retry", round.retry},
                              {"arrays", round.arrays},
                              {"collect", round.collect},
                              {"points", round.points},
                              {"tasks", round.tasks}}
                                 .dump(2) +
                             "\n");
}

std::string joined(const std::vector<std::string>& words, const char* between) {
    std::string text;
    for (const std::string& word : words)
        text += (text.empty() ? "" : between) + word;
    return text;
}

/// States of jobs and their tasks as far as Slurm still knows them; jobs that it has forgotten are
/// an error of squeue's and have ended.
std::vector<std::string> job_states(const std::vector<std::string>& jobs, const char* which) {
    if (jobs.empty()) return {};
    const ProgramEnd end =
        run_program({"squeue", "--noheader", "--array", "--jobs=" + joined(jobs, ","),
                     std::string("--states=") + which, "--format=%T"});
    if (end.status == 127)
        throw OutputError("squeue", "cannot be started; is this a machine of a Slurm cluster?",
                          end.errors);
    std::vector<std::string> states;
    std::istringstream lines(end.output);
    for (std::string line; std::getline(lines, line);)
        if (const std::string state = trimmed_end(line); !state.empty()) states.push_back(state);
    return states;
}

/// Also while its collection is, which may submit a round of its own.
bool is_under_way(const SlurmRound& round) {
    std::vector<std::string> jobs = round.arrays;
    if (!round.collect.empty()) jobs.push_back(round.collect);
    return !job_states(jobs, "PENDING,RUNNING,SUSPENDED,COMPLETING,CONFIGURING").empty();
}

std::vector<std::size_t> missing_points(const std::string& folder, const Study& study) {
    std::vector<std::size_t> missing;
    for (std::size_t index = 0; index < study.points; ++index)
        if (!PointFolder::is_finished(folder, point_name(study, index))) missing.push_back(index);
    return missing;
}

std::string this_executable() {
    std::error_code error;
    const fs::path path = fs::read_symlink("/proc/self/exe", error);
    return error ? "rille" : path.string();
}

/// Submits the arrays one behind the other, so that the limit of tasks at once holds for all, then
/// the collection behind all of them. What was submitted is written down at once.
void submit(OutputFolder& out, SlurmRound& round, std::size_t scripts) {
    for (std::size_t a = 0; a < scripts; ++a) {
        std::vector<std::string> words{"sbatch", "--parsable"};
        if (a > 0) words.push_back("--dependency=afterany:" + round.arrays.back());
        words.push_back(fmt::format("{}/array_{}.sh", round.folder, a));
        const std::string answer = trimmed_end(slurm(words));
        round.arrays.push_back(answer.substr(0, answer.find(';'))); // a cluster's name may follow
        write_round(out, round);
    }
    const std::string answer = trimmed_end(
        slurm({"sbatch", "--parsable", "--dependency=afterany:" + joined(round.arrays, ":"),
               round.folder + "/collect.sh"}));
    round.collect = answer.substr(0, answer.find(';'));
    write_round(out, round);
}

SlurmRound new_round(const std::string& folder, const Study& study,
                     const std::vector<std::size_t>& missing, double seconds, double memory_mb,
                     int retry) {
    const std::size_t number = rounds_of(folder).size() + 1;
    SlurmRound round;
    round.folder =
        (fs::absolute(folder) / study_names::slurm / fmt::format("{:04}", number)).string();
    round.retry = retry;
    round.points = missing.size();
    const SlurmPlan plan = slurm_plan(study, missing.size(), seconds, memory_mb, longest_array());
    std::error_code error;
    fs::create_directories(round.folder, error);
    OutputFolder out(round.folder, OutputFolder::Existing::keep);
    std::string list;
    for (const std::size_t index : missing)
        list += std::to_string(index) + "\n";
    out.write(list_name, list);
    const SlurmPaths paths{this_executable(), fs::absolute(folder).string(), round.folder};
    for (std::size_t a = 0; a < plan.arrays.size(); ++a) {
        out.write(fmt::format("array_{}.sh", a),
                  slurm_array_script(study, plan, paths, round.tasks, plan.arrays[a]));
        round.tasks += plan.arrays[a];
    }
    out.write("collect.sh", slurm_collect_script(study, plan, paths));
    submit(out, round, plan.arrays.size());
    return round;
}

/// Names of points that some process has begun and left, wherever it ran.
std::vector<std::string> begun_points(const std::string& folder) {
    std::vector<std::string> names;
    std::error_code none;
    for (const auto& found : fs::directory_iterator(fs::path(folder) / study_names::points, none)) {
        const PointEntry entry = read_point_entry(found.path().filename().string());
        if (entry.kind == PointEntry::Kind::running) names.push_back(entry.point);
    }
    return names;
}

} // namespace

SlurmAnswer submit_missing(const std::string& folder, const Study& study,
                           const std::function<std::pair<double, double>()>& cost, int retry) {
    const std::vector<std::string> rounds = rounds_of(folder);
    SlurmAnswer answer;
    if (!rounds.empty() && retry == 0) {
        answer.round = read_round(rounds.back());
        if (is_under_way(answer.round)) {
            answer.kind = SlurmAnswer::Kind::under_way;
            answer.missing = study.points - count_finished_points(folder);
            return answer;
        }
    }
    clear_ended_points(folder, !rounds.empty());
    const std::vector<std::size_t> missing = missing_points(folder, study);
    answer.missing = missing.size();
    if (missing.empty()) return answer;
    std::pair<double, double> needs{0, 0};
    if (!study.slurm.seconds_per_point || !study.slurm.memory_mb) needs = cost();
    answer.kind = SlurmAnswer::Kind::submitted;
    answer.round = new_round(folder, study, missing, needs.first, needs.second, retry);
    return answer;
}

std::vector<std::size_t> points_of_task(const std::string& round, std::size_t task,
                                        std::size_t points_per_task) {
    std::istringstream lines(read_file((fs::path(round) / list_name).string()));
    std::vector<std::size_t> points;
    const std::size_t first = task * points_per_task;
    std::size_t at = 0;
    for (std::size_t index = 0; lines >> index; ++at)
        if (at >= first && at < first + points_per_task) points.push_back(index);
    return points;
}

std::string look_after_round(const std::string& folder, const Study& study,
                             const std::string& round_folder,
                             const std::function<std::pair<double, double>()>& cost) {
    const SlurmRound round = read_round(round_folder);
    const std::vector<std::string> begun = begun_points(folder);
    clear_ended_points(folder, true);
    const std::size_t missing = missing_points(folder, study).size();
    if (missing == 0) return "every point has its result";
    const std::vector<std::string> states = job_states(round.arrays, "all");
    if (std::find(states.begin(), states.end(), "CANCELLED") != states.end())
        return fmt::format("{} points are missing; tasks were cancelled, so nothing is submitted",
                           missing);
    if (round.retry < study.slurm.retries_killed) {
        const SlurmAnswer answer = submit_missing(folder, study, cost, round.retry + 1);
        return fmt::format(
            "{} points whose tasks were killed, or stopped at the end of their time, "
            "are submitted once more: job {}",
            missing, joined(answer.round.arrays, ", "));
    }
    std::size_t given_up = 0;
    for (std::size_t index = 0; index < study.points; ++index) {
        const std::string name = point_name(study, index);
        if (std::find(begun.begin(), begun.end(), name) != begun.end() &&
            !PointFolder::is_finished(folder, name)) {
            record_killed_point(
                folder, study, index, round.retry + 1,
                fmt::format("its task was killed, {} times in all", round.retry + 1));
            ++given_up;
        }
    }
    std::string text = "nothing is submitted any more: slurm.retries.killed is used up";
    if (given_up > 0) text += fmt::format("; {} points are given up", given_up);
    if (missing > given_up)
        text += fmt::format("; {} points are missing, and what was stopped has its state: the same "
                            "command goes on",
                            missing - given_up);
    return text;
}

} // namespace rille::engine
