// SPDX-License-Identifier: Apache-2.0
// What each cause has removed, carried with the front through whole runs.
#include "engine/metrics.hpp"
#include "engine/simulation.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using tests::etch_by_ions;
using tests::flat_yield;
using tests::run_quietly;
using tests::TrenchCase;

namespace {

constexpr int bow_causes = 3; ///< ions straight from the plasma, reflected ions, radicals

/// Walls that ions of some spread, reflected ions and radicals widen, down to a stop that nothing
/// etches: the trench is open from the start, so that only the walls move.
TrenchCase wall_case(double ions, double reflection, double radicals) {
    TrenchCase t(120, 2, 40, 150);
    t.add_opening("trench", 60);
    t.set_ions(60 * ions, fluxes::IonDistribution::gaussian(100, std::tan(5 * M_PI / 180)));
    etch_by_ions(t, 0, flat_yield(1));
    const int radical = t.add_neutral("F", 200 * radicals);
    t.chemistry(0).processes.push_back(fluxes::SpontaneousEtching{radical, {0.002, 0, 300}, 1, {}});
    t.c.ions_per_species = 65536;
    for (auto& law : t.c.reflection)
        law = {50, 1, 0.5 * reflection, 2, 28, 3};
    engine::StartContour start;
    start.lines = {{{-60, 40}, {-30, 40}, {-30, -150}, {30, -150}, {30, 40}, {60, 40}}};
    start.low = -158;
    start.high = 48;
    t.c.start = start;
    t.add_step("main", 12);
    return t;
}

struct Bow {
    double width = 0; ///< of both walls together [nm]
    double by[bow_causes] = {}, all = 0;
};

/// Amount of a field on both walls at a height, straight between the middles of elements.
double on_walls(const engine::RunResult& run, std::size_t field, double z) {
    const auto& s = run.last.surface;
    double sum = 0;
    for (std::size_t e = 0; e + 1 < s.size(); ++e) {
        const double a = s.centre[e].z, b = s.centre[e + 1].z;
        if (std::fabs(s.normal[e].x) < 0.9 || (a <= z) == (b <= z)) continue;
        const double t = (z - a) / (b - a);
        sum += (1 - t) * run.last.removed[field][e] + t * run.last.removed[field][e + 1];
    }
    return sum;
}

Bow bow_of(const TrenchCase& t) {
    const auto run = run_quietly(t.c);
    REQUIRE(run.record.status == "done");
    const auto site = engine::feature_sites(t.c)[0];
    const auto widest = geometry::widest_cd(t.c.domain, run.last.surface, site, -140, -5);
    REQUIRE(widest);
    Bow bow;
    bow.width = widest->cd.value - 60;
    using namespace fluxes;
    for (int k = 0; k <= engine::unexplained_removal; ++k) {
        const double part = on_walls(run, k, widest->z);
        const bool is_direct = k == enhanced_cause || k == sputtering_cause;
        bow.by[k == neutral_cause ? 2 : is_direct ? 0 : 1] += part;
        bow.all += part;
    }
    return bow;
}

} // namespace

// Oracle: the bow of the same run with 5 % less of one mechanism: less reflection changes the first
// bounce in proportion, twice in two; less ions changes both kinds; the rates are linear in all of
// them and the walls move by their sum.
// Source: derived here.
// Tolerance: the change of the bow within 10 % of what its share says; a share that is half as
// large again must fail. Sum of the causes at the bow: within 1 % of the widening (carried
// amounts).
TEST_CASE("less of a mechanism takes its share of the bow", "[validation][causes]") {
    const Bow base = bow_of(wall_case(1, 1, 1));
    WARN("bow " << base.width << " nm: direct " << base.by[0] << ", reflected " << base.by[1]
                << ", radicals " << base.by[2] << ", sum " << base.all);
    CHECK(base.all == Approx(base.width).epsilon(0.01));
    for (const double part : base.by)
        CHECK(part > 0.15 * base.width);
    const auto check = [&](const TrenchCase& t, double share) {
        const double change = bow_of(t).width - base.width, said = -0.05 * share;
        WARN("change of the bow " << change << " nm, its share says " << said);
        CHECK(std::fabs(change - said) < 0.1 * std::fabs(said));
        CHECK_FALSE(std::fabs(change - 1.5 * said) < 0.1 * std::fabs(1.5 * said));
    };
    check(wall_case(1, 1, 0.95), base.by[2]);
    check(wall_case(0.95, 1, 1), base.by[0] + base.by[1]);
    check(wall_case(0.95, 1 / 0.95, 1), base.by[0]);
}

// Oracle: the floor's depth. Source: definition. Tolerance: 3 % of the depth (noise of the way from
// element to element).
TEST_CASE("what the causes removed from a floor is its depth", "[validation][causes]") {
    TrenchCase t(120, 2, 40, 150);
    t.add_opening("trench", 60);
    t.set_ions(60, fluxes::IonDistribution::gaussian(100, std::tan(3 * M_PI / 180)));
    etch_by_ions(t, 0, flat_yield(1));
    etch_by_ions(t, 1, flat_yield(0.3));
    for (auto& law : t.c.reflection)
        law = {60, 1, 0.8, 2, 28, 3};
    t.c.ions_per_species = 8192;
    t.add_step("main", 60);
    const auto run = run_quietly(t.c);
    const auto& s = run.last.surface;
    int checked = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        if (s.normal[e].z < 0.98 || s.centre[e].z > -20 || std::fabs(s.centre[e].x) > 15) continue;
        double all = 0;
        for (int k = 0; k <= engine::unexplained_removal; ++k)
            all += run.last.removed[k][e];
        CHECK(all == Approx(-s.centre[e].z).epsilon(0.03));
        ++checked;
    }
    CHECK(checked > 5);
}
