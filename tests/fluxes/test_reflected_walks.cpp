// SPDX-License-Identifier: Apache-2.0
#include "fluxes/reflected_ions.hpp"
#include "tests/support/forward_ions.hpp"
#include "tests/support/forward_walk.hpp"
#include "tests/support/shapes.hpp"
#include "tests/support/statistics.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::RayCaster;
using geometry::Surface;

namespace {

/// Reflected ions drawn at their first contact against plain forward tracing: pulls of 24 bins.
struct Comparison {
    const Domain& domain;
    const Surface& surface;
    IonSource source;
    std::vector<IonReflection> laws;
    std::vector<int> material;
    int bins = 24;

    Comparison(const Domain& d, const Surface& s, IonDistribution law)
        : domain(d), surface(s), source{"Ar+", 40, 1.0, std::move(law)}, laws(2) {
        laws[1].target_mass_amu = 60; // walls and floor of two materials
        laws[1].critical_deg = 50;
        laws[1].scatter_deg = 8;
        for (const Vec3& centre : s.centre)
            material.push_back(centre.z < -20 ? 1 : 0);
    }

    void check(int ions, int drawn, int scrambles, double fault = 0.02) const {
        const RayCaster caster(domain, surface, 5);
        const auto bin = tests::bins_below(surface, -1e-6, bins);
        const auto walk = tests::forward_ions(domain, surface, caster, source, laws, material, bin,
                                              bins, ions, 5);
        std::vector<std::vector<double>> value(bins);
        double lost = 0;
        for (int r = 0; r < scrambles; ++r) {
            const tests::TabulatedIons direct(domain, surface, caster, {source},
                                              {{0, {SquareRootLaw{1, 0}, FlatAngle{}, 1}}},
                                              {64, 3, std::uint64_t(r)});
            const ReflectedIons reflected =
                trace_reflected(domain, surface, caster, material, direct, laws,
                                {drawn, 3, std::uint64_t(r), false});
            lost += reflected.lost_share;
            std::vector<double> sum(bins, 0), area(bins, 0);
            for (std::size_t e = 0; e < surface.size(); ++e) {
                if (bin[e] < 0) continue;
                area[bin[e]] += surface.area[e];
                for (int b = 0; b < batches; ++b)
                    sum[bin[e]] +=
                        surface.area[e] * tests::reflected_tally(reflected, b, 0, int(e)) / batches;
            }
            for (int b = 0; b < bins; ++b)
                value[b].push_back(sum[b] / area[b]);
        }
        const auto compare = [&](double scale) {
            std::vector<double> pulls;
            for (int b = 0; b < bins; ++b) {
                const tests::Mean mean(value[b]);
                if (walk.value[b] == 0 && mean.value == 0) continue; // nothing comes there
                pulls.push_back((walk.value[b] - scale * mean.value) /
                                std::hypot(mean.error, walk.error[b]));
            }
            return tests::Pulls(pulls);
        };
        const tests::Pulls pulls = compare(1);
        INFO("chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest << " mean "
                        << pulls.mean << " errors " << walk.error[bins / 2] / walk.value[bins / 2]
                        << " and " << tests::Mean(value[bins / 2]).error / walk.value[bins / 2]);
        CHECK(pulls.agree());
        CHECK(lost < 1e-5);
        CHECK_FALSE(compare(1 + fault).agree());
        CHECK_FALSE(compare(1 - fault).agree());
    }
};

} // namespace

// Oracle: plain forward tracing of ions from the source plane, pseudo-random, no weights.
// Source: independent code (only the ray caster and the laws of one reflection are shared).
// Tolerance: 24 bins, chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean pull < 4/sqrt(n),
// errors of both sides added in squares; values 2 % off (in the hole 4 %) must fail.
TEST_CASE("reflected ions drawn where they strike, in a trench", "[reflected]") {
    Domain d;
    d.spacing = 2;
    d.cells_x = 40;
    // A bowed wall under a lip: some places see the sky over a part of their length only.
    const Surface s = tests::polyline(d,
                                      {{-40, 0, 0},
                                       {-16, 0, 0},
                                       {-15, 0, -20},
                                       {-19, 0, -50},
                                       {-14, 0, -100},
                                       {13, 0, -98},
                                       {18, 0, -40},
                                       {15, 0, -20},
                                       {18, 0, 0},
                                       {40, 0, 0}},
                                      2.0);
    Comparison(d, s, IonDistribution::thermal_fall(100, 0.8, 0.4)).check(3000000, 4096, 16);
    d.sides = geometry::Sides::periodic;
    Surface joined = s;
    joined.next.back() = 0;
    joined.previous.front() = static_cast<int>(s.size()) - 1;
    Comparison(d, joined, IonDistribution::gaussian(100, 0.2)).check(1500000, 4096, 16);
}

TEST_CASE("reflected ions drawn where they strike, in a hole", "[reflected]") {
    Domain d;
    d.symmetry = geometry::Symmetry::full;
    d.cells_x = d.cells_y = 40;
    std::vector<std::array<double, 2>> profile;
    for (int i = 0; i <= 20; ++i)
        profile.push_back({12 + 2 * std::sin(std::acos(-1.0) * i / 20), -2.5 * i});
    for (const double r : {9.0, 6.0, 3.0, 0.0})
        profile.push_back({r, -50 - 0.05 * (12 - r)});
    const Surface s = tests::revolved_hole(d, profile, 40);
    Comparison(d, s, IonDistribution::gaussian(100, 0.3)).check(4000000, 32768, 8, 0.04);
}
