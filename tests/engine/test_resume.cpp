// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/output_folder.hpp"
#include "engine/run.hpp"
#include "geometry/check.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille::engine;

namespace {

/// The trench example, coarse and short, with a second plasma after the first.
std::string two_plasmas() {
    std::string text = read_file(std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml");
    const auto replace = [&](const std::string& old, const std::string& now) {
        const std::size_t at = text.find(old);
        REQUIRE(at != std::string::npos);
        text.replace(at, old.size(), now);
    };
    replace("spacing: 2 nm", "spacing: 8 nm");
    replace("no_longer_than: 150 s}", "no_longer_than: 2 s}");
    replace("plasma: main, time", "plasma: soft, time");
    replace("30 % of main", "40 % of main");
    replace("chemistry:", "  soft: {from: main, rf_bias: {mean_sheath: 60 V}}\nchemistry:");
    return text + "sampling: {ions_per_species: 512}\nframes: {every: 0.9 s}\n";
}

/// Keeps the state after every refresh.
struct Keeper : RunObserver {
    std::vector<RunState> states;
    int frames = 0;
    void progressed(const Simulation&, const HistoryRow&, double) override {}
    void framed(const SurfaceState&) override { ++frames; }
    void resumable(bool, const std::function<RunState()>& state) override {
        states.push_back(state());
    }
};

bool same_shape(const RunResult& a, const RunResult& b) {
    bool same = a.shape.size() == b.shape.size() && !a.shape.empty();
    for (std::size_t p = 0; same && p < a.shape.size(); ++p) {
        const auto &one = a.shape[p].places, &other = b.shape[p].places;
        same = one.size() == other.size();
        for (std::size_t i = 0; same && i < one.size(); ++i)
            same = one[i].now_nm == other[i].now_nm && one[i].removed == other[i].removed;
    }
    return same;
}

bool same_bits(const RunResult& a, const RunResult& b) {
    const auto& s = a.last.surface;
    const auto& t = b.last.surface;
    bool same = s.size() == t.size() && s.vertices == t.vertices && a.last.rate == b.last.rate &&
                a.last.displacement == b.last.displacement && same_shape(a, b) &&
                a.last.grown.thickness == b.last.grown.thickness &&
                a.last.fields.size() == b.last.fields.size();
    for (std::size_t f = 0; same && f < a.last.fields.size(); ++f)
        same = a.last.fields[f].value == b.last.fields[f].value;
    return same;
}

} // namespace

// Oracle: the unbroken run, stopped nowhere. Source: definition. Tolerance: none, bit for bit. A
// state with one number changed must give another result.
TEST_CASE("a run that is taken up goes on to the same bits", "[resume]") {
    const Case c = parse_case(two_plasmas(), "case.yaml", ".");
    const std::atomic<bool> stop{false};
    Keeper keeper;
    const RunResult whole = run_case(c, keeper, stop);
    REQUIRE(whole.record.status == "not cleared");
    REQUIRE(keeper.states.size() >= 4);
    bool switched = false;
    for (std::size_t n = 0; n < keeper.states.size(); ++n) {
        // Through the form that lies in the folder.
        const RunState state = read_state(c, state_text(c, keeper.states[n]), "state.bin");
        Keeper rest;
        const RunResult again = resume_case(c, state, rest, stop);
        CAPTURE(n, keeper.states.size());
        CHECK(same_bits(whole, again));
        CHECK(history_csv(c, again.history) == history_csv(c, whole.history));
        CHECK(again.record.rays == whole.record.rays);
        CHECK(again.record.refreshes == whole.record.refreshes);
        CHECK(again.record.resumed == 1);
        CHECK(again.record.warnings == whole.record.warnings);
        CHECK(again.record.steps.size() == 2);
        CHECK(rest.states.size() == keeper.states.size() - n - 1);
        switched = switched || state.history.back().step == "over";
    }
    CHECK(switched); // a state of each step was among them

    Keeper second; // stopped twice
    resume_case(c, keeper.states[0], second, stop);
    Keeper rest;
    const RunResult twice = resume_case(c, second.states.at(1), rest, stop);
    CHECK(same_bits(whole, twice));
    CHECK(twice.record.resumed == 2);

    RunState other = keeper.states[2];
    other.next_frame_s += 0.05;
    CHECK_FALSE(same_bits(whole, resume_case(c, other, rest, stop)));
}

TEST_CASE("a state that does not belong here is refused", "[resume]") {
    const Case c = rille::tests::trench_case();
    RunState state;
    state.simulation = "front";
    state.history.resize(2);
    for (HistoryRow& row : state.history)
        row.features.resize(1);
    state.frames = {{0, "frames/frame_0000.vtp"}};
    const std::string text = state_text(c, state);
    const RunState again = read_state(c, text, "state.bin");
    CHECK(again.frames.at(0).file == "frames/frame_0000.vtp");
    CHECK(again.history.size() == 2);

    CHECK_THROWS_WITH(read_state(c, "", "state.bin"), Catch::Contains("not a saved state"));
    CHECK_THROWS_WITH(read_state(c, text.substr(0, text.size() - 1), "state.bin"),
                      Catch::Contains("damaged"));
    std::string damaged = text;
    damaged[damaged.size() / 2] ^= 1;
    CHECK_THROWS_AS(read_state(c, damaged, "state.bin"), OutputError);
    Case changed = c;
    changed.resolved_yaml += "\n";
    CHECK_THROWS_WITH(read_state(changed, text, "state.bin"), Catch::Contains("was changed"));
    CHECK_THROWS_AS(Simulation(c, "not a state"), rille::NumericsError);
}
