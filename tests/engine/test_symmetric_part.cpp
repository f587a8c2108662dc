// SPDX-License-Identifier: Apache-2.0
// Cases that are the same on both sides of their middle are computed on one side.
#include "engine/estimate.hpp"
#include "engine/metrics.hpp"
#include "engine/symmetric_part.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>

using namespace rille;
using namespace rille::engine;
using geometry::Sides;
using geometry::Surface;
using geometry::Vec3;
using tests::etch_by_ions;
using tests::flat_yield;
using tests::TrenchCase;

namespace {

/// Ions that lean and a neutral that etches where they do not: nothing of it is sampled in
/// extruded.
TrenchCase trench() {
    TrenchCase t(64, 1, 20, 200);
    t.add_opening("trench", 30);
    t.set_ions(40, fluxes::IonDistribution::gaussian(100, 0.1));
    const int gas = t.add_neutral("A", 30);
    etch_by_ions(t, 0, flat_yield(1));
    t.chemistry(0).processes.push_back(fluxes::SpontaneousEtching{gas, {0.05}, 1, {}});
    etch_by_ions(t, 1, flat_yield(0.1));
    t.add_step("main", 30);
    return t;
}

TrenchCase via() {
    TrenchCase t(44, 1, 12, 200);
    t.c.domain.symmetry = geometry::Symmetry::full;
    t.c.domain.cells_y = 36;
    t.add_opening("via", 22);
    t.c.mask.openings.back().shape = geometry::Opening::Shape::elliptic;
    t.c.mask.openings.back().width_y = 18;
    t.set_ions(50, tests::straight_down());
    etch_by_ions(t, 0, flat_yield(1));
    t.add_step("main", 12);
    return t;
}

std::array<bool, 2> folded(const Case& c) {
    const geometry::Fold fold = symmetric_part(c).fold;
    return {fold.x, fold.y};
}

} // namespace

TEST_CASE("what is computed of a period", "[symmetric]") {
    // Oracle: by hand. Source: definition: what is the same on both sides of the middle.
    using Planes = std::array<bool, 2>;
    const Planes neither{false, false}, x{true, false}, y{false, true}, both{true, true};
    CHECK(folded(trench().c) == x);
    CHECK(folded(via().c) == both);
    CHECK(computed_share(symmetric_part(trench().c).fold) == "half of the period");
    CHECK(computed_share(symmetric_part(via().c).fold) == "a quarter of the period");
    SECTION("ions that lean") {
        Case c = via().c;
        Plasma tilted = c.plasmas["main"];
        tilted.name = "tilted";
        tilted.ion_tilt_deg = 2;
        tilted.ion_azimuth_deg = 0;
        c.plasmas["tilted"] = tilted;
        CHECK(folded(c) == y);
        c.plasmas["tilted"].ion_azimuth_deg = 90;
        CHECK(folded(c) == x);
        c.plasmas["tilted"].ion_azimuth_deg = 30;
        CHECK(folded(c) == neither);
    }
    SECTION("sides that repeat, and a start from a contour") {
        Case repeats = trench().c, started = trench().c;
        repeats.domain.sides = Sides::periodic;
        CHECK(folded(repeats) == neither);
        started.start.emplace();
        CHECK(folded(started) == neither);
        CHECK(computed_share(symmetric_part(started).fold) == "the whole period");
    }
    SECTION("too few cells for a part") {
        Case c = via().c;
        c.domain.cells_y = 14;
        CHECK(folded(c) == x);
    }
    SECTION("two features") {
        TrenchCase t = trench();
        t.c.mask.openings[0].width_x = 10;
        t.c.mask.openings[0].centre_x = -14;
        CHECK(folded(t.c) == neither);
        t.add_opening("other", 10, 14);
        CHECK(folded(t.c) == x);
    }
}

TEST_CASE("a part of a case tells what the whole one does", "[symmetric]") {
    // Oracle: the case whose sides repeat: all of its period is computed, and of a symmetric period
    // it is the same case. Source: symmetry (definition). Tolerance: 2e-3 nm (0.04 in full) for
    // places, metrics and what each cause has moved: contours meet the middle in two ways, 1 nm
    // cells; 0.4 deg for an angle over 5 nm of height, 1.5 cells for where a wall is widest.
    const bool full = GENERATE(false, true);
    CAPTURE(full);
    const Case c = full ? via().c : trench().c;
    Case repeats = c;
    repeats.domain.sides = Sides::periodic;
    const RunResult some = tests::run_quietly(c), all = tests::run_quietly(repeats);
    CHECK(some.record.computed == (full ? "a quarter of the period" : "half of the period"));
    CHECK(all.record.computed == "the whole period");
    CHECK(double(all.record.voxels) / some.record.voxels == Approx(full ? 4 : 2).epsilon(0.02));

    // Of floors and walls, away from corners.
    const double h = c.domain.spacing;
    const Surface &s = some.last.surface, &whole = all.last.surface;
    double wall = 0, floor = 0;
    int places = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const Vec3 at = s.centre[e];
        const bool level = s.normal[e].z > 0.99;
        if (at.z > -2 * h || (!level && at.z < -6 * h)) continue;
        std::size_t near = 0;
        for (std::size_t f = 1; f < whole.size(); ++f)
            if ((whole.centre[f] - at).length() < (whole.centre[near] - at).length()) near = f;
        double& worst = level ? floor : wall;
        worst = std::max(worst, std::fabs((at - whole.centre[near]).dot(whole.normal[near])));
        ++places;
    }
    const double limit = full ? 0.04 : 2e-3; // [nm]
    CHECK(wall < limit);
    CHECK(floor < limit);
    CHECK(places >= (full ? 500 : 20));
    const auto metrics = measure(c, some.last).metrics,
               expected = measure(repeats, all.last).metrics;
    REQUIRE(metrics.size() == expected.size());
    int compared = 0;
    for (std::size_t m = 0; m < metrics.size(); ++m) {
        CAPTURE(metrics[m].name);
        if (!metrics[m].value || !expected[m].value) continue;
        // Along a wall that is all but upright the widest place is found within a cell or so.
        const double within = metrics[m].unit == "deg"         ? 0.4
                              : metrics[m].name == "bow depth" ? 1.5 * h
                                                               : limit;
        CHECK(std::fabs(*metrics[m].value - *expected[m].value) < within);
        ++compared;
    }
    CHECK(compared >= 8);
    REQUIRE(some.shape.size() == all.shape.size());
    for (std::size_t p = 0; p < some.shape.size(); ++p) {
        const auto &a = some.shape[p].places, &b = all.shape[p].places;
        REQUIRE(a.size() == b.size());
        double worst = 0, cause = 0;
        for (std::size_t i = 0; i < a.size(); ++i) {
            worst = std::max(worst, std::fabs(a[i].now_nm - b[i].now_nm));
            for (std::size_t k = 0; k < a[i].removed.size(); ++k)
                cause = std::max(cause, std::fabs(a[i].removed[k] - b[i].removed[k]));
        }
        CHECK(a.size() >= 8);
        CHECK(worst < limit);
        CHECK(cause < limit);
    }
}

TEST_CASE("what is announced of a case is what is computed of it", "[symmetric]") {
    // Oracle: the case whose sides repeat has twice as much. Source: definition.
    // Tolerance: 5 % of counts (sides).
    const Case c = trench().c;
    Case repeats = c;
    repeats.domain.sides = Sides::periodic;
    const Estimate some = estimate_run(c), all = estimate_run(repeats);
    CHECK(some.computed == "half of the period");
    CHECK(all.computed == "the whole period");
    CHECK(2.0 * some.elements == Approx(all.elements).epsilon(0.05));
    CHECK(2.0 * some.voxels == Approx(all.voxels).epsilon(0.05));
    CHECK(estimate_text(c, some).find("# computed: half of the period, about") !=
          std::string::npos);
}
