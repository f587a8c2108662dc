// SPDX-License-Identifier: Apache-2.0
// What a study costs beside its points: processor time of a point as a worker does it against the
// same point run plainly, turn by turn in one process; the time that the process which hands points
// out takes for each; and its memory, for few points and for many.
#include "engine/case_file.hpp"
#include "engine/metrics.hpp"
#include "engine/output_folder.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run.hpp"
#include "engine/study/point_run.hpp"
#include "engine/study/study_folder.hpp"
#include "engine/study/study_names.hpp"
#include "tests/bench/timing.hpp"

#include <csignal>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <nlohmann/json.hpp>
#include <spawn.h>
#include <sstream>
#include <sys/wait.h>
#include <tbb/global_control.h>
#include <unistd.h>

extern char** environ;

namespace {

using namespace rille;
using namespace rille::engine;
namespace fs = std::filesystem;

constexpr int repeats = 40;
constexpr int few_along = 10, many_along = 1000; // of each of two axes

struct Watcher : RunObserver {
    void progressed(const Simulation&, const HistoryRow&, double) override {}
    void framed(const SurfaceState&) override {}
};

/// A study over bias and electron temperature of the small case of the tests.
std::string write_study(const fs::path& folder, int along) {
    fs::create_directories(folder);
    const fs::path data = fs::path(RILLE_TESTS) / "data" / "study" / "case.yaml";
    fs::copy_file(data, folder / "case.yaml", fs::copy_options::overwrite_existing);
    std::ofstream(folder / "study.yaml")
        << "format: 1\ntitle: many\nbase: case.yaml\nplan: full grid\nvary:\n"
        << "  plasmas.main.rf_bias.amplitude: {from: 100 V, to: 200 V, points: " << along << "}\n"
        << "  plasmas.main.electron_temperature: {from: 2 eV, to: 4 eV, points: " << along << "}\n";
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

/// Processor time [s] of a process so far, without its children.
double own_seconds(pid_t pid) {
    std::ifstream file("/proc/" + std::to_string(pid) + "/stat");
    std::string line;
    std::getline(file, line);
    std::istringstream words(line.substr(line.rfind(')') + 1));
    std::string word;
    for (int n = 3; n < 14; ++n)
        words >> word;
    double user = 0, system = 0;
    words >> user >> system;
    return (user + system) / static_cast<double>(sysconf(_SC_CLK_TCK));
}

struct Parent {
    double mb = 0, ms_per_point = 0;
};

/// The parent while it hands out points, between the fifth and the fortieth.
Parent watch_parent(const fs::path& folder, int along) {
    const fs::path out = folder / "out";
    const pid_t pid = start(write_study(folder, along), out.string());
    const auto ended = [&] {
        std::error_code none;
        return std::distance(fs::directory_iterator(out / study_names::points, none), {});
    };
    const auto wait_for = [&](int count) {
        for (int waited = 0; waited < 6000 && ended() < count; ++waited)
            usleep(20000);
    };
    wait_for(5);
    const double from = own_seconds(pid);
    wait_for(40);
    const Parent parent{peak_mb(pid), 1e3 * (own_seconds(pid) - from) / 35};
    kill(pid, SIGKILL);
    int status = 0;
    waitpid(pid, &status, 0);
    usleep(500000); // its worker hears of it
    return parent;
}

/// A point read, run, measured and written, with nothing around it.
void run_plainly(const StudyAtWork& work, std::size_t index, const fs::path& folder) {
    const std::atomic<bool> stop{false};
    const Case c = parse_case(work.base_text, "case.yaml", folder.string(),
                              point_overrides(work.study, study_point(work.study, index)));
    Watcher watcher;
    const RunResult result = run_case(c, watcher, stop);
    std::ofstream(folder / "profile.csv") << profile_csv(c, result.last);
    std::ofstream(folder / "metrics.json") << metrics_json(c, measure(c, result.last)).dump(2);
}

} // namespace

int main() {
    const tbb::global_control one(tbb::global_control::max_allowed_parallelism, 1);
    std::string name = (fs::temp_directory_path() / "rille-bench-XXXXXX").string();
    if (!mkdtemp(name.data())) return 1;
    const fs::path folder = name;
    const Study study = load_study(write_study(folder / "plain", few_along));
    const std::string out = (folder / "plain" / "out").string();
    prepare_study_folder(out, study, study_sources(study), false);
    const StudyAtWork work = open_study(out);
    const std::atomic<bool> stop{false};
    std::vector<double> plain, more;
    for (int n = 0; n < repeats; ++n) {
        plain.push_back(bench::thread_seconds([&] { run_plainly(work, n, folder / "plain"); }));
        more.push_back(bench::thread_seconds([&] { run_point(work, n, 1, stop, {}); }) -
                       plain.back());
    }
    const Parent few = watch_parent(folder / "few", few_along);
    const Parent many = watch_parent(folder / "many", many_along);
    fs::remove_all(folder);
    const double own_ms = 1e3 * bench::median(plain);
    const double overhead_ms = 1e3 * bench::median(more) + few.ms_per_point;
    std::cout << nlohmann::json{{"bench", "study"},
                                {"ratio", 1 + overhead_ms / own_ms},
                                {"goal", "<= 1.05, or <= 20 ms a point"},
                                {"own_ms_per_point", own_ms},
                                {"overhead_ms_per_point", overhead_ms},
                                {"parent_ms_per_point", few.ms_per_point},
                                {"parent_MB_for_100_points", few.mb},
                                {"parent_MB_for_1000000_points", many.mb}}
                     .dump()
              << std::endl;
    return 0;
}
