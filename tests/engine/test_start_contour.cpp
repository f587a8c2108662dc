// SPDX-License-Identifier: Apache-2.0
// Runs that start from a contour: what is read, what is refused, and what comes of it.
#include "engine/case_file.hpp"
#include "engine/output_folder.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <fstream>

using namespace rille;
using namespace rille::engine;
using rille::tests::ScratchFolder;

namespace {

std::string trench_text(const std::string& more) {
    std::string text = read_file(std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml");
    const auto replace = [&](const std::string& old, const std::string& now) {
        const std::size_t at = text.find(old);
        REQUIRE(at != std::string::npos);
        text.replace(at, old.size(), now);
    };
    replace("spacing: 2 nm", "spacing: 4 nm");
    replace("no_longer_than: 150 s}", "no_longer_than: 2 s}");
    return text + "sampling: {ions_per_species: 512}\n" + more;
}

void write(const std::string& path, const std::string& text) {
    std::ofstream(path) << text;
}

/// What the reader says to a contour; empty if it takes it.
std::string said_to(const std::string& rows, const std::string& more = "") {
    const ScratchFolder folder;
    write(folder / "c.csv", rows);
    try {
        parse_case(trench_text("start: {contour: c.csv" + more + "}\n"), "case.yaml", folder.path(),
                   {});
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

const std::string good =
    "x_nm,z_nm\n-80,180\n-36,180\n-30,0\n-28,-100\n28,-100\n30,0\n36,180\n80,180\n";

double widest_gap(const geometry::Surface& a, const geometry::Surface& b) {
    double worst = 0;
    for (const auto& p : a.vertices) {
        double nearest = HUGE_VAL;
        for (std::size_t e = 0; e < b.size(); ++e) {
            const auto s = b.vertices[b.corners[e][0]], d = b.vertices[b.corners[e][1]] - s;
            const double t = std::clamp((p - s).dot(d) / d.length2(), 0.0, 1.0);
            nearest = std::min(nearest, (p - s - d * t).length());
        }
        worst = std::max(worst, nearest);
    }
    return worst;
}

} // namespace

TEST_CASE("a run starts from a contour", "[start]") {
    // Oracle: the points of the file; materials by depth. Source: derived here.
    // Tolerance: 1e-3 nm on straight pieces.
    const ScratchFolder folder;
    write(folder / "c.csv", good);
    const Case c =
        parse_case(trench_text("start: {contour: c.csv}\n"), "case.yaml", folder.path(), {});
    REQUIRE(c.start);
    CHECK(c.inputs.size() == 1);
    CHECK(c.resolved_yaml.find("inputs/c.csv") != std::string::npos);
    Simulation simulation(c);
    const auto materials = simulation.materials();
    int checked = 0;
    for (std::size_t e = 0; e < materials.size(); ++e) {
        const auto p = simulation.surface().centre[e];
        if (std::fabs(p.z + 100) < 1e-3 && std::fabs(p.x) < 20) ++checked;
        if (p.z > 5) CHECK(c.materials[materials[e]] == "resist");
        if (p.z < -5) CHECK(c.materials[materials[e]] == "Si");
    }
    CHECK(checked >= 8);
    simulation.step(1); // and it can be etched
    CHECK(simulation.time_s() > 0);
}

TEST_CASE("a profile that a run has left is taken as it is", "[start]") {
    // Oracle: the surface that was saved. Source: definition.
    // Tolerance: 0.02 cell (corners are rebuilt); pieces off corners 1e-3 cell.
    const ScratchFolder folder;
    const Case first = parse_case(trench_text(""), "case.yaml", folder.path(), {});
    Simulation before(first);
    before.step(1);
    SurfaceState state;
    state.surface = before.surface();
    state.grown = before.films();
    fill_state(state, first, before.arrivals());
    write(folder / "profile.csv", profile_csv(first, state));
    const Case second =
        parse_case(trench_text("start: {contour: profile.csv}\n"), "case.yaml", folder.path(), {});
    const Simulation after(second);
    CHECK(widest_gap(after.surface(), before.surface()) < 0.02 * 4);
    CHECK(widest_gap(before.surface(), after.surface()) < 0.02 * 4);
}

TEST_CASE("pixels are scaled and turned over", "[start]") {
    const ScratchFolder folder;
    write(folder / "c.csv",
          "x_px,y_px\n0,0\n44,0\n50,180\n52,280\n108,280\n110,180\n116,0\n160,0\n");
    const Case c =
        parse_case(trench_text("start: {contour: c.csv, scale: 1 nm/px, origin: '80, 180 px'}\n"),
                   "case.yaml", folder.path(), {});
    REQUIRE(c.start);
    CHECK(c.start->lines[0].front() == std::array<double, 2>{-80, 180});
    CHECK(c.start->lines[0][3] == std::array<double, 2>{-28, -100});
}

TEST_CASE("what is wrong with a contour is named with its place", "[start]") {
    CHECK(said_to(good) == "");
    const auto says = [](const std::string& rows, const std::string& what,
                         const std::string& more = "") {
        const std::string said = said_to(rows, more);
        INFO(said);
        CHECK(said.find(what) != std::string::npos);
    };
    const std::string head = "x_nm,z_nm\n";
    says(head + "-80,0\n30,0\n30,-40\n0,-40\n0,20\n80,20\n",
         "c.csv:5:1: the contour crosses itself");
    says(head + "-80,0\n30,0\n30,-40\n0,-40\n0,20\n80,20\n", "line 2");
    says(head + "-60,0\n80,0\n",
         "c.csv:2:1: the contour does not span the period: it begins at x = -60");
    says(head + "-80,0\n60,0\n",
         "c.csv:3:1: the contour does not span the period: it ends at x = 60");
    says(head + "80,0\n-80,0\n", "c.csv:2:1: the contour runs from right");
    says(head + "-80,0\n100,0\n", "c.csv:3:1: the point (100, 0) nm lies outside the period");
    says(head + "-80,0\n", "fewer than two points");
    says("x_px,y_px\n0,0\n160,0\n", "start.scale is due");
    says(good, "leave start.scale out", ", scale: 1 nm/px");
    says("a,b\n1,2\n", "stands where the columns");
    // A traced contour with a piece missing.
    std::string traced = head;
    for (int i = -40; i <= 40; ++i)
        if (i < -8 || i > 8) traced += std::to_string(2 * i) + "," + std::to_string(i % 3) + "\n";
    says(traced, "c.csv:34:1: an open gap of 36");
    // Elements of a profile that do not join.
    says("x_nm,z_nm,arc_length_nm,normal_deg,length_nm,chain\n-40,0,40,0,80,0\n45,0,120,0,70,0\n",
         "c.csv:3:1: an open gap of 10");
}

TEST_CASE("a start contour is for sections", "[start]") {
    const ScratchFolder folder;
    write(folder / "c.csv", good);
    std::string text =
        trench_text("start: {contour: c.csv}\nliner: {material: SiO2, thickness: 3 nm}\n");
    CHECK_THROWS_WITH(parse_case(text, "case.yaml", folder.path(), {}),
                      Catch::Contains("belongs to mask and stack as drawn"));
    text.replace(text.find("symmetry: extruded"), 18, "symmetry: full    ");
    CHECK_THROWS_WITH(parse_case(text, "case.yaml", folder.path(), {}),
                      Catch::Contains("a contour is a section"));
    CHECK_THROWS_WITH(parse_case(trench_text("contour: c.csv\n"), "case.yaml", folder.path(), {}),
                      Catch::Contains("start: {contour: FILE}"));
}
