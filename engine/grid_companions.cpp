// SPDX-License-Identifier: Apache-2.0
#include "engine/grid_search.hpp"
#include "engine/number_text.hpp"
#include "engine/run.hpp"

#include <fmt/format.h>

namespace rille::engine {
namespace {

/// Only how far a companion has come is of interest.
class CompanionWatcher : public RunObserver {
public:
    CompanionWatcher(const GridWatch& watch, std::string words)
        : watch_(watch), words_(std::move(words)) {}
    void progressed(const Simulation&, const HistoryRow&, double share) override {
        if (watch_.progressed) watch_.progressed(words_, share);
    }
    void framed(const SurfaceState&) override {}

private:
    const GridWatch& watch_;
    const std::string words_;
};

} // namespace

std::optional<GridSearch::Next> run_companions(GridSearch& search, const GridWatch& watch,
                                               const std::atomic<bool>& stop) {
    for (;;) {
        GridSearch::Next next = search.next();
        if (next.kind != GridSearch::Next::Kind::companion) return next;
        const std::string words =
            fmt::format("grid {} of {} that bound the error: spacing {} nm", next.companion,
                        next.companions, rounded(next.the_case.domain.spacing));
        CompanionWatcher watcher(watch, words);
        const RunResult result = run_case(next.the_case, watcher, stop);
        if (result.record.status == "interrupted") return std::nullopt;
        Metrics metrics;
        if (!result.error) metrics = measure(next.the_case, result.last);
        search.add(next, metrics, result.record.failure, result.record.wall_seconds);
        if (watch.noted)
            watch.noted(words + (result.error ? ": failed: " + result.record.failure : ": done"));
        if (watch.save) watch.save(search.text());
    }
}

} // namespace rille::engine
