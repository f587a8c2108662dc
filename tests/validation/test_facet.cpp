// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>

using namespace rille;
using namespace rille::tests;

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double opening = 30;

double peaked_yield(double slope) { // f = 2, optimum 65 deg
    const double x = std::sqrt(1 + slope * slope), f = 2, optimum = 65 * pi / 180;
    return std::pow(x, f) * std::exp(-f * std::cos(optimum) * (x - 1));
}

/// Drop below the original top at distance d inside a vertical edge, for flat removal 1: the
/// Riemann solution max over slopes p of H(p) - p d.
double exact_drop(double d) {
    double most = 0;
    for (double p = 0; p < 20; p += 1e-3)
        most = std::max(most, peaked_yield(p) - p * d);
    return most;
}

engine::RunResult erode_mask(double thickness, double removed, double spacing) {
    TrenchCase t(90, spacing, thickness, 50);
    t.add_opening("trench", opening);
    t.set_ions(50, straight_down()); // 1 nm/s on the flat
    etch_by_ions(t, 1, {fluxes::ConstantLaw{1.0}, fluxes::YamamuraAngle{2, 65}, 1.0});
    t.add_step("main", removed);
    return run_quietly(t.c);
}

} // namespace

// Oracle: D(d) = max over p of [H(p) - p d] per unit of flat removal; 1.7644, 1.5593, 1.3722,
// 1.2024, 1.0502, 1 at d = 0, 0.1, ..., 0.5; the facet leans 65 deg at the edge and 53.66 deg at
// its foot. Source: Riemann problem of a surface whose speed depends on its slope, derived here;
// yield form: Yamamura, Radiat. Eff. 80, 57 (1984). Tolerance: 0.5 cell normal to the facet on
// average, 1 cell at most; slope 1.5 deg.
TEST_CASE("facet of a mask corner", "[validation][facet]") {
    CHECK(exact_drop(0) == Approx(1.7644).margin(1e-4));
    CHECK(exact_drop(0.2) == Approx(1.3722).margin(1e-4));
    CHECK(exact_drop(0.45) == Approx(1.0).margin(1e-4));
    const double removed = 40, thickness = 80, spacing = 1;
    const auto outcome = erode_mask(thickness, removed, spacing);
    double sum = 0, most = 0;
    int count = 0;
    double sx = 0, sz = 0, sxx = 0, sxz = 0; // line fit of the middle of the facet
    int fitted = 0;
    for (const auto& v : outcome.last.surface.vertices) {
        const double d = (std::fabs(v.x) - 0.5 * opening) / removed;
        const double drop = (thickness - v.z) / removed;
        if (v.z < 1 || d < 0.02 || d > 0.5) continue;
        const double slope = (exact_drop(d - 0.01) - exact_drop(d + 0.01)) / 0.02;
        const double off =
            std::fabs(drop - exact_drop(d)) * removed / spacing / std::sqrt(1 + slope * slope);
        sum += off;
        most = std::max(most, off);
        ++count;
        if (d < 0.1 || d > 0.3) continue;
        ++fitted;
        sx += d;
        sz += drop;
        sxx += d * d;
        sxz += d * drop;
    }
    REQUIRE(count > 20);
    REQUIRE(fitted > 10);
    const double lean = std::atan((sx * sz - fitted * sxz) / (fitted * sxx - sx * sx)) * 180 / pi;
    const double expected = std::atan((exact_drop(0.1) - exact_drop(0.3)) / 0.2) * 180 / pi;
    WARN("facet: mean " << sum / count << " cell, largest " << most << " cell, leans " << lean
                        << " deg, " << expected << " expected");
    CHECK(sum / count < 0.5);
    CHECK(most < 1.0);
    CHECK(lean == Approx(expected).margin(1.5));
}

// Oracle: the edge breaks through when the flat mask has lost 1 / 1.7644 of its thickness; then the
// opening grows as the facet crosses the mask's bottom, d = max over p of (H(p) removed - t) / p.
// Source: as above. Tolerance: 0.5 cell a side.
TEST_CASE("a facet that breaks through opens the mask", "[validation][facet]") {
    const double thickness = 35.288, spacing = 1; // breach at a flat removal of 20
    for (const double removed : {18.0, 26.0}) {
        const auto outcome = erode_mask(thickness, removed, spacing);
        TrenchCase t(90, spacing, thickness, 50);
        t.add_opening("trench", opening);
        const auto cd = geometry::cd_at(t.c.domain, outcome.last.surface,
                                        engine::feature_sites(t.c)[0], 0.5 * spacing);
        REQUIRE(cd);
        double opened = 0;
        for (double p = 0.5; p < 20; p += 1e-3)
            opened =
                std::max(opened, (peaked_yield(p) * removed - (thickness - 0.5 * spacing)) / p);
        WARN("flat removal " << removed << ": opened by " << 0.5 * (cd->value - opening)
                             << " nm a side, " << opened << " expected");
        CHECK(0.5 * (cd->value - opening) == Approx(opened).margin(0.5 * spacing));
    }
}
