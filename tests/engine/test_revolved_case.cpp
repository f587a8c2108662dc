// SPDX-License-Identifier: Apache-2.0
// A round via in r and z from its case file to its outputs.
#include "engine/case_file.hpp"
#include "engine/metrics.hpp"
#include "engine/output_folder.hpp"
#include "engine/picture.hpp"
#include "engine/problems.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run.hpp"
#include "engine/section.hpp"
#include "engine/vtk_files.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <cstdio>
#include <fstream>

using namespace rille;
using namespace rille::engine;

namespace {

/// The contact example as a revolved case; `changes` are pairs of old and new text.
std::string contact(const std::vector<std::pair<std::string, std::string>>& changes = {}) {
    std::string text = read_file(std::string(RILLE_ROOT) + "/examples/contact-via/case.yaml");
    const auto replace = [&](const std::string& old, const std::string& now) {
        const std::size_t at = text.find(old);
        REQUIRE(at != std::string::npos);
        text.replace(at, old.size(), now);
    };
    replace("symmetry: full    ", "symmetry: revolved");
    replace("pitch: [96 nm, 96 nm]", "pitch: 96 nm");
    for (const auto& [old, now] : changes)
        replace(old, now);
    return text;
}

std::string problems_of(const std::string& text) {
    try {
        parse_case(text, "case.yaml", ".");
    } catch (const std::exception& error) {
        return error.what();
    }
    return "";
}

/// Keeps the state after every refresh.
struct Keeper : RunObserver {
    std::vector<RunState> states;
    void progressed(const Simulation&, const HistoryRow&, double) override {}
    void framed(const SurfaceState&) override {}
    void resumable(bool, const std::function<RunState()>& state) override {
        states.push_back(state());
    }
};

} // namespace

TEST_CASE("a revolved case is read", "[revolved][case]") {
    // Oracle: the pitch is the diameter of the cell: 12 cells of 4 nm from the axis to its side.
    // Source: README. Tolerance: none.
    const Case c = parse_case(contact(), "case.yaml", ".");
    CHECK(c.domain.revolved());
    CHECK(c.domain.cells_x == 12);
    CHECK(c.domain.cells_y == 1);
    CHECK(c.domain.spacing == 4);
    CHECK(c.domain.x_min() == 0);
    REQUIRE(c.mask.openings.size() == 1);
    CHECK(c.mask.openings[0].width_x == Approx(56));
}

TEST_CASE("what is not round about the axis is refused", "[revolved][case]") {
    // Oracle: messages that name what is wrong and what will do. Source: README. Tolerance: none.
    const std::string hole = "{name: hole, shape: round, cd: 56 nm, cd_at: mask bottom}";
    const auto with = [&](const std::string& opening) {
        return problems_of(contact({{hole, opening}}));
    };
    CHECK_THAT(with("{name: hole, shape: trench, cd: 56 nm}"),
               Catch::Contains("trench needs symmetry: extruded or full"));
    CHECK_THAT(with("{name: hole, shape: lines, cd: 20 nm, space: 20 nm, count: 2}"),
               Catch::Contains("lines needs symmetry: extruded or full"));
    CHECK_THAT(with("{name: hole, shape: elliptic, cd: [56 nm, 40 nm]}"),
               Catch::Contains("elliptic hole needs symmetry: full"));
    CHECK_THAT(with("{name: hole, shape: round, cd: 56 nm, centre: 8 nm}"),
               Catch::Contains("off it needs symmetry: full"));
    CHECK_THAT(with("{name: hole, shape: round, cd: 30 nm}\n    - {name: two, shape: round, cd: "
                    "20 nm}"),
               Catch::Contains("several need symmetry: full"));
    CHECK_THAT(with("{name: hole, shape: round, cd: 100 nm}"), Catch::Contains("does not fit"));
    CHECK_THAT(problems_of(contact({{"sides: mirror", "sides: periodic"}})),
               Catch::Contains("a round cell does not repeat"));
    CHECK_THAT(problems_of(contact({{"pitch: 96 nm", "pitch: [96 nm, 96 nm]"}})),
               Catch::Contains("revolved has one pitch"));
    CHECK_THAT(
        problems_of(contact({{"    rf_bias:", "    ion_tilt: {angle: 2 deg}\n    rf_bias:"}})),
        Catch::Contains("ions that lean"));
    CHECK(problems_of(contact()).empty());
}

TEST_CASE("a revolved run writes its whole section and goes on to the same bits",
          "[revolved][resume]") {
    // Oracle: the unbroken run; the section is its own mirror image. Source: definition.
    // Tolerance: none.
    const Case c = parse_case(contact({{"no_longer_than: 120 s}", "no_longer_than: 1.5 s}"},
                                       {"spacing: 4 nm", "spacing: 8 nm"},
                                       {"time: 25 % of main", "time: 40 % of main"},
                                       {"ions_per_species: 4096", "ions_per_species: 512"}}),
                              "case.yaml", ".");
    const std::atomic<bool> stop{false};
    Keeper keeper;
    const RunResult whole = run_case(c, keeper, stop);
    REQUIRE(keeper.states.size() >= 3);
    for (const std::size_t n : {std::size_t(0), keeper.states.size() / 2}) {
        const RunState state = read_state(c, state_text(c, keeper.states[n]), "state.bin");
        Keeper rest;
        const RunResult again = resume_case(c, state, rest, stop);
        CHECK(again.last.surface.vertices == whole.last.surface.vertices);
        CHECK(again.last.displacement == whole.last.displacement);
        CHECK(again.last.rate == whole.last.rate);
    }

    const geometry::Surface& s = whole.last.surface;
    const Section section = vertical_section(c.domain, s, 0);
    REQUIRE(section.size() == 1);
    const SectionLine& line = section[0];
    REQUIRE(line.element.size() == 2 * s.size());
    const std::size_t last = line.points.size() - 1;
    CHECK(line.points[0][0] == -48);
    CHECK(line.points[last][0] == 48);
    for (std::size_t i = 0; i <= last; ++i) {
        CHECK(line.points[i][0] == -line.points[last - i][0]);
        CHECK(line.points[i][1] == line.points[last - i][1]);
    }
    for (std::size_t i = 0; i < line.element.size(); ++i) {
        const double dx = line.points[i + 1][0] - line.points[i][0];
        const double dz = line.points[i + 1][1] - line.points[i][1];
        const geometry::Vec3 n = normal_of(s, line, i);
        CHECK(dx * n.z - dz * n.x == Approx(std::hypot(dx, dz))); // the gas on the left
    }

    const std::string csv = profile_csv(c, whole.last);
    CHECK(csv.find("r_nm,z_nm,arc_length_nm,normal_deg,length_nm,area_nm2,chain") == 0);
    const SurfaceState back = [&] {
        const std::string path = "revolved_front.vtp";
        std::ofstream(path) << vtp_text(c, whole.last);
        SurfaceState state = read_vtp(c, path);
        std::remove(path.c_str());
        return state;
    }();
    CHECK(back.surface.vertices == s.vertices);
    CHECK(back.surface.area == s.area);
    CHECK(back.surface.next == s.next);

    const Metrics metrics = measure(c, whole.last);
    for (const char* name : {"depth centre", "top cd", "top cd y", "top cd area", "bow",
                             "sidewall angle left", "mask left", "undercut"}) {
        const Metric* metric = metrics.find(name);
        CAPTURE(name);
        REQUIRE(metric);
    }
    CHECK(metrics.find("top cd")->value.value() == metrics.find("top cd y")->value.value());
    CHECK(picture_svg(c, {}, whole.last, metrics).find("section through the axis") !=
          std::string::npos);
}
