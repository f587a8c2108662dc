// SPDX-License-Identifier: Apache-2.0
// What a study costs beside its points: processor time of `rille study` on one worker against the
// same points run one after another in this process, and the memory of the process that hands
// points out, for few points and for many.
#include "engine/case_file.hpp"
#include "engine/metrics.hpp"
#include "engine/output_folder.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run.hpp"
#include "engine/study/study.hpp"
#include "engine/study/study_names.hpp"
#include "tests/bench/timing.hpp"

#include <csignal>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <nlohmann/json.hpp>
#include <spawn.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <tbb/global_control.h>
#include <unistd.h>

extern char** environ;

namespace {

using namespace rille;
using namespace rille::engine;
namespace fs = std::filesystem;

constexpr std::size_t points = 100, many_points = 200000;

struct Watcher : RunObserver {
    void progressed(const Simulation&, const HistoryRow&, double) override {}
    void framed(const SurfaceState&) override {}
};

/// A study over the bias of the small case of the tests.
std::string write_study(const fs::path& folder, std::size_t count) {
    fs::create_directories(folder);
    const fs::path data = fs::path(RILLE_TESTS) / "data" / "study" / "case.yaml";
    fs::copy_file(data, folder / "case.yaml", fs::copy_options::overwrite_existing);
    std::ofstream(folder / "study.yaml")
        << "format: 1\ntitle: many\nbase: case.yaml\nvary: {plasmas.main.rf_bias.amplitude: "
           "{from: 100 V, to: 200 V, points: "
        << count << "}}\nplan: full grid\n";
    return (folder / "study.yaml").string();
}

pid_t start(const std::string& file, const std::string& out) {
    std::string words[] = {RILLE_PROGRAM, "study", file, "-o", out, "--workers", "1", "--quiet"};
    std::vector<char*> arguments;
    for (std::string& word : words)
        arguments.push_back(word.data());
    arguments.push_back(nullptr);
    pid_t pid = -1;
    if (posix_spawn(&pid, RILLE_PROGRAM, nullptr, nullptr, arguments.data(), environ) != 0)
        throw std::runtime_error("rille cannot be started");
    return pid;
}

double children_seconds() {
    rusage usage{};
    getrusage(RUSAGE_CHILDREN, &usage);
    const auto seconds = [](const timeval& t) {
        return static_cast<double>(t.tv_sec) + 1e-6 * static_cast<double>(t.tv_usec);
    };
    return seconds(usage.ru_utime) + seconds(usage.ru_stime);
}

/// Largest memory [MB] of a process so far; 0 once it has ended.
double peak_mb(pid_t pid) {
    std::ifstream file("/proc/" + std::to_string(pid) + "/status");
    for (std::string word; file >> word;)
        if (word == "VmHWM:") {
            double kb = 0;
            file >> kb;
            return kb / 1024;
        }
    return 0;
}

/// Memory of the parent while it hands out points, after some have ended.
double parent_mb(const fs::path& folder, std::size_t count) {
    const std::string out = (folder / "out").string();
    const pid_t pid = start(write_study(folder, count), out);
    double peak = 0;
    for (int waited = 0; waited < 1200; ++waited) {
        usleep(50000);
        peak = std::max(peak, peak_mb(pid));
        std::error_code none;
        const fs::path at = fs::path(out) / study_names::points;
        if (std::distance(fs::directory_iterator(at, none), {}) > 5) break;
    }
    kill(pid, SIGKILL);
    int status = 0;
    waitpid(pid, &status, 0);
    usleep(500000); // its worker hears of it
    return peak;
}

/// The points themselves: each read, run, measured and written, with nothing around it.
void run_plainly(const Study& study, const fs::path& folder) {
    const std::string text = study.base.resolved_yaml;
    const std::atomic<bool> stop{false};
    for (std::size_t index = 0; index < study.points; ++index) {
        const Case c = parse_case(text, "case.yaml", folder.string(),
                                  point_overrides(study, study_point(study, index)));
        Watcher watcher;
        const RunResult result = run_case(c, watcher, stop);
        std::ofstream(folder / "profile.csv") << profile_csv(c, result.last);
        std::ofstream(folder / "metrics.json") << metrics_json(c, measure(c, result.last)).dump(2);
    }
}

} // namespace

int main() {
    const tbb::global_control one(tbb::global_control::max_allowed_parallelism, 1);
    std::string name = (fs::temp_directory_path() / "rille-bench-XXXXXX").string();
    if (!mkdtemp(name.data())) return 1;
    const fs::path folder = name;
    const Study study = load_study(write_study(folder / "few", points));
    const double own = bench::process_seconds([&] { run_plainly(study, folder / "few"); });
    const double before = children_seconds();
    int status = 0;
    waitpid(start(study.file, (folder / "few" / "out").string()), &status, 0);
    const double whole = children_seconds() - before;
    const double few = parent_mb(folder / "memory_few", points);
    const double many = parent_mb(folder / "memory_many", many_points);
    fs::remove_all(folder);
    if (status != 0) return 1;
    std::cout << nlohmann::json{{"bench", "study"},
                                {"ratio", whole / own},
                                {"goal", "<= 1.05, or <= 20 ms a point"},
                                {"points", points},
                                {"own_ms_per_point", 1e3 * own / points},
                                {"overhead_ms_per_point", 1e3 * (whole - own) / points},
                                {"parent_MB", few},
                                {"parent_MB_for_200000_points", many}}
                     .dump()
              << std::endl;
    return 0;
}
