// SPDX-License-Identifier: Apache-2.0
#include "engine/grid_search.hpp"
#include "engine/metrics.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <map>

using namespace rille;
using namespace rille::tests;

namespace {

const std::vector<std::string> judged = {"top cd", "middle cd", "bow cd"};

/// A short etch of a trench, `cells` across the pitch of 80 nm.
engine::Case etch_on(int cells, std::uint64_t seed, bool reflected) {
    TrenchCase t(80, 80.0 / cells, 40, 200);
    t.add_opening("trench", 40);
    t.c.seed = seed;
    t.c.ions_per_species = 4096;
    t.set_ions(60, fluxes::IonDistribution::gaussian(100, 0.04));
    for (const int material : {0, 1})
        if (reflected) t.c.reflection[material] = fluxes::IonReflection{};
    etch_by_ions(t, 0, {fluxes::SquareRootLaw{0.12, 10}, fluxes::PlateauCosine{78}, 1});
    t.add_step("main", 30);
    t.c.cd_places = {{"top", {"6 nm below film top", -6}}, {"middle", {"15 nm deep", -15}}};
    t.c.assess_grid_error = true;
    return t.c;
}

engine::Metrics assessed(const engine::Case& c) {
    engine::GridSearch search(c);
    const std::atomic<bool> stop{false};
    const auto main = engine::run_companions(search, {}, stop);
    REQUIRE(main);
    REQUIRE(main->kind == engine::GridSearch::Next::Kind::main);
    engine::Metrics metrics = engine::measure(main->the_case, run_quietly(main->the_case).last);
    search.assess(main->the_case, metrics);
    return metrics;
}

/// Limit of spacing zero from spacings two and four times finer, errors taken to be linear in them.
std::map<std::string, double> truth_of(int cells, bool reflected) {
    std::map<int, engine::Metrics> known;
    const auto value = [&](int n, const std::string& name) {
        if (!known.count(n)) {
            const engine::Case c = etch_on(n, 1, reflected);
            known[n] = engine::measure(c, run_quietly(c).last);
        }
        return known[n].find(name)->value.value();
    };
    std::map<std::string, double> truth;
    for (const std::string& name : judged)
        truth[name] = 2 * value(4 * cells, name) - value(2 * cells, name);
    return truth;
}

struct Score {
    int inside = 0, inside_of_tenth = 0, inside_of_half = 0, all = 0;
    double squares = 0, errors = 0, bars = 0;

    void add(double error, double bar) {
        ++all;
        inside += std::fabs(error) <= bar;
        inside_of_half += std::fabs(error) <= 0.5 * bar;
        inside_of_tenth += std::fabs(error) <= 0.1 * bar;
        squares += std::pow(error / (0.5 * bar), 2);
        errors += error * error;
        bars += bar;
    }
    double rms_pull() const { return std::sqrt(squares / all); }
    double bar_over_error() const { return bars / all / std::sqrt(errors / all); }
};

/// Runs that differ in seed and grid, each on so many of the grids in turn. All four places that
/// the edges of the opening can have between nodes come up as often.
std::map<std::string, Score> score(int runs, int first_grid, int grids, bool reflected) {
    const std::map<std::string, double> truth = truth_of(32, reflected);
    std::map<std::string, Score> scores;
    for (int run = 0; run < runs; ++run) {
        const engine::Metrics metrics =
            assessed(etch_on(first_grid + run % grids, run + 1, reflected));
        for (const std::string& name : judged) {
            const engine::Metric& m = *metrics.find(name);
            REQUIRE(m.grid_error);
            scores[name].add(*m.value - truth.at(name), m.error());
        }
    }
    for (const auto& [name, s] : scores)
        WARN(name << (reflected ? "" : " without reflected ions") << ": " << s.inside << " of "
                  << s.all << " inside, rms(error / sigma) " << s.rms_pull() << ", bar / rms error "
                  << s.bar_over_error());
    return scores;
}

} // namespace

// Oracle: the limit of spacing zero from grids two and four times finer.
// Source: Richardson extrapolation (common practice, no source); definition of a standard error.
// Tolerance: error bars are for 95 %: of 6 runs one may lie outside, bars a tenth as long must lose
// most of them, and bars are at most 3 times the rms error, all three values together (6 runs say
// little of the rms of one), so that they cannot pass by their length.
TEST_CASE("error bars hold the limit of fine grids", "[validation][grid]") {
    double bars = 0;
    const auto scores = score(6, 30, 6, true);
    for (const auto& [name, s] : scores) {
        INFO(name);
        CHECK(s.all == 6);
        CHECK(s.inside >= 5);
        CHECK(s.inside_of_tenth <= 3);
        bars += s.bar_over_error() / double(scores.size());
    }
    CHECK(bars <= 3);
}

// The same in 40 runs of 40 seeds on 20 grids, and in as many without reflected ions. At least 36
// of 40 inside, rms(error / sigma) from 0.5 to 1.5 where sigma is half a bar, a bar at most 3 times
// the rms error; bars half as long must lose too many.
TEST_CASE("error bars hold the limit of fine grids in 40 runs", "[validation][grid][long]") {
    for (const bool reflected : {true, false}) {
        int inside_of_half = 0;
        const auto scores = score(40, 26, 20, reflected);
        for (const auto& [name, s] : scores) {
            INFO(name << (reflected ? "" : " without reflected ions"));
            CHECK(s.inside >= 36);
            CHECK(s.rms_pull() > 0.5);
            CHECK(s.rms_pull() < 1.5);
            CHECK(s.bar_over_error() <= 3);
            inside_of_half += s.inside_of_half;
        }
        CHECK(inside_of_half < 36 * int(scores.size()));
    }
}
