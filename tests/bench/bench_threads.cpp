// SPDX-License-Identifier: Apache-2.0
// A whole run of the trench of examples/ on one thread and on two, turn by turn in one process. The
// time is that on the wall, so nothing else may run meanwhile; processor time beside it says what
// the second thread costs.
#include "tests/bench/example_case.hpp"
#include "tests/bench/timing.hpp"

#include "engine/profile_csv.hpp"
#include "geometry/keep_memory.hpp"

#include <iostream>
#include <nlohmann/json.hpp>
#include <tbb/global_control.h>
#include <thread>

using namespace rille;
using namespace rille::bench;

namespace {

struct Timed {
    double wall = 0, cpu = 0;
    std::string profile;
};

Timed run_on(int threads, const engine::Case& the_case) {
    const tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
    const std::atomic<bool> stop{false};
    Watcher watcher;
    Timed t;
    engine::RunResult result;
    t.wall = seconds([&] {
        t.cpu = process_seconds([&] { result = engine::run_case(the_case, watcher, stop); });
    });
    t.profile = engine::profile_csv(the_case, result.last);
    return t;
}

} // namespace

int main() {
    geometry::keep_freed_memory(); // as the program does
    const engine::Case the_case =
        example("poly-trench", {"spacing=1 nm", "recipe.steps.main.no_longer_than=1.5 s",
                                "recipe.steps.over.time=0.25 s"});
    constexpr int pairs = 3;
    std::vector<double> ratio, cost, one_s, two_s;
    bool same = true;
    run_on(2, the_case); // what the sheath leaves in the cache is there for both
    for (int n = 0; n < pairs; ++n) {
        const Timed one = run_on(1, the_case), two = run_on(2, the_case);
        ratio.push_back(one.wall / two.wall);
        cost.push_back(two.cpu / one.cpu);
        one_s.push_back(one.wall);
        two_s.push_back(two.wall);
        same = same && one.profile == two.profile;
    }
    std::cout << nlohmann::json{{"bench", "threads"},
                                {"ratio", median(ratio)},
                                {"goal", 1.8},
                                {"one_thread_s", median(one_s)},
                                {"two_threads_s", median(two_s)},
                                {"processor_time_two_over_one", median(cost)},
                                {"same_profile", same},
                                {"cores", std::thread::hardware_concurrency()},
                                {"note", "whole run, extruded, on the wall clock"}}
                     .dump()
              << std::endl;
    return same ? 0 : 1;
}
