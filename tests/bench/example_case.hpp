// SPDX-License-Identifier: Apache-2.0
// The cases of examples/, made finer or shorter for a bench.
#pragma once

#include "engine/case_file.hpp"
#include "engine/run.hpp"

#include <string>
#include <vector>

namespace rille::bench {

inline engine::Case example(const std::string& name, const std::vector<std::string>& overrides) {
    return engine::load_case(std::string(RILLE_EXAMPLES) + "/" + name + "/case.yaml", overrides);
}

/// Watches a run and says nothing.
struct Watcher : engine::RunObserver {
    void progressed(const engine::Simulation&, const engine::HistoryRow&, double) override {}
    void framed(const engine::SurfaceState&) override {}
};

} // namespace rille::bench
