// SPDX-License-Identifier: Apache-2.0
// What a step of a run in three dimensions costs as its surface gets more cells, and the memory
// that it takes at its peak: the contact hole of examples/ at several spacings.
#include "tests/bench/example_case.hpp"
#include "tests/bench/timing.hpp"

#include "geometry/keep_memory.hpp"

#include <cmath>
#include <fstream>
#include <iostream>
#include <limits>
#include <malloc.h>
#include <nlohmann/json.hpp>

using namespace rille;
using namespace rille::bench;

namespace {

/// [bytes] of this process: "VmRSS:" now, "VmHWM:" the most since forget_peak.
double memory_bytes(const std::string& wanted) {
    std::ifstream file("/proc/self/status");
    for (std::string word; file >> word;)
        if (word == wanted) {
            double kb = 0;
            file >> kb;
            return 1024 * kb;
        }
    return std::numeric_limits<double>::quiet_NaN();
}

void forget_peak() {
    std::ofstream("/proc/self/clear_refs") << 5;
}

struct Step {
    double elements = 0, wall = 0, cpu = 0, bytes = 0;
};

/// One step of a run: arrivals gathered twice, the front advanced twice, films carried.
Step one_step(double spacing_nm) {
    const engine::Case the_case =
        example("contact-via", {"spacing=" + std::to_string(spacing_nm) + " nm"});
    malloc_trim(0); // what earlier steps gave back is not there before
    forget_peak();
    const double before = memory_bytes("VmRSS:");
    engine::Simulation simulation(the_case);
    simulation.arrivals(); // tables that are made once
    Step step;
    step.wall = seconds([&] {
        step.cpu = process_seconds([&] {
            simulation.step(std::numeric_limits<double>::infinity());
            simulation.arrivals();
        });
    });
    step.elements = static_cast<double>(simulation.surface().size());
    step.bytes = memory_bytes("VmHWM:") - before;
    return step;
}

} // namespace

int main() {
    geometry::keep_freed_memory(); // as the program does
    std::vector<double> spacings = {4, 2.4, 1.5};
    std::vector<Step> steps;
    nlohmann::json elements = nlohmann::json::array(), cpu = elements, bytes = elements;
    double x = 0, y = 0, xx = 0, xy = 0, xw = 0, yw = 0;
    one_step(4); // what the sheath leaves in the cache
    for (const double spacing : spacings) {
        const Step s = one_step(spacing);
        elements.push_back(s.elements);
        cpu.push_back(s.cpu);
        bytes.push_back(s.bytes / s.elements);
        const double n = std::log(s.elements), t = std::log(s.cpu), w = std::log(s.wall);
        x += n, y += t, yw += w, xx += n * n, xy += n * t, xw += n * w;
    }
    const double m = static_cast<double>(spacings.size());
    const auto exponent = [&](double sum, double product) {
        return (m * product - x * sum) / (m * xx - x * x);
    };
    std::cout << nlohmann::json{{"bench", "growth"},
                                {"ratio", exponent(y, xy)},
                                {"ratio_wall_time", exponent(yw, xw)},
                                {"goal", "<= 1.1"},
                                {"elements", elements},
                                {"processor_seconds_per_step", cpu},
                                {"note", "exponent of the processor time of a step against the "
                                         "number of surface elements, full"}}
                     .dump()
              << std::endl;
    std::cout << nlohmann::json{{"bench", "memory"},
                                {"ratio", bytes.back()},
                                {"goal", "<= 600"},
                                {"elements", elements},
                                {"bytes_per_element", bytes},
                                {"note", "most that a step takes beyond what the process has "
                                         "before it, full"}}
                     .dump()
              << std::endl;
}
