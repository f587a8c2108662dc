// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exact_exchange.hpp"
#include "fluxes/exchange.hpp"
#include "tests/support/cavities.hpp"
#include "tests/support/forward_walk.hpp"
#include "tests/support/statistics.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using fluxes::Exchange;
using geometry::Domain;
using geometry::RayCaster;
using tests::Cavity;

namespace {

Cavity bowed_hole() {
    Domain d;
    d.symmetry = geometry::Symmetry::full;
    d.cells_x = d.cells_y = 28;
    std::vector<std::array<double, 2>> profile;
    for (int i = 0; i <= 20; ++i)
        profile.push_back({8 + 5 * std::sin(std::acos(-1.0) * i / 20), -1.5 * i});
    for (const double r : {6.0, 4.0, 2.0, 0.0})
        profile.push_back({r, -30 - 0.05 * (8 - r)});
    return {"bowed hole", d, tests::revolved_hole(d, profile, 40)};
}

std::vector<double> pulls_of(const tests::WalkResult& r, double expected) {
    std::vector<double> pulls;
    for (std::size_t b = 0; b < r.flux.size(); ++b)
        pulls.push_back((r.flux[b] - expected) / r.error[b]);
    return pulls;
}

} // namespace

TEST_CASE("zero sticking gives flux 1 everywhere by forward walks", "[neutrals]") {
    // Oracle: equilibrium: under a cosine source with zero sticking the impinging flux is 1 on
    // every element of every cavity.
    // Source: derived here.
    // Tolerance: 60 equal-area bins, chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean
    // pull < 4/sqrt(n), seed fixed; sticking of 2 % and an emission law cos^1.4 must both fail.
    for (const Cavity& c :
         {tests::straight_trench(), tests::bowed_trench(), tests::necked_trench(), bowed_hole()}) {
        const RayCaster caster(c.domain, c.surface, 1.0);
        const auto bin = tests::bins_below(c.surface, -1e-6, 60);
        const auto walk = [&](double sticking, double power) {
            return tests::forward_walk(c.domain, c.surface, caster,
                                       std::vector<double>(c.surface.size(), sticking), bin, 60,
                                       {600000, 7, power});
        };
        const auto right = walk(0, 1);
        const tests::Pulls pulls(pulls_of(right, 1));
        INFO(c.name << ": chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest
                    << " mean " << pulls.mean << " lost " << right.lost << " error "
                    << right.error[0]);
        CHECK(pulls.agree());
        CHECK(right.lost < 1e-5);
        CHECK_FALSE(tests::Pulls(pulls_of(walk(0.02, 1), 1)).agree());
        CHECK_FALSE(tests::Pulls(pulls_of(walk(0, 1.4), 1)).agree());
    }
}

TEST_CASE("forward deposits agree with the exchange operator", "[neutrals]") {
    // Oracle: forward random walks with sticking; in trenches against the exact factors, in the
    // hole against the rays averaged over 16 scrambles. Source: derived here. Tolerance: 20 bins,
    // chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean pull < 4/sqrt(n), errors of both
    // sides added in squares; sticking 10 % too large in the operator must fail.
    for (const Cavity& c :
         {tests::straight_trench(), tests::bowed_trench(), tests::necked_trench(), bowed_hole()}) {
        const RayCaster caster(c.domain, c.surface, 1.0);
        const int bins = 20, scrambles = c.domain.extruded() ? 1 : 16;
        const auto bin = tests::bins_below(c.surface, -1e-6, bins);
        const auto sticking = [&](double scale) {
            std::vector<double> s(c.surface.size());
            for (std::size_t e = 0; e < s.size(); ++e)
                s[e] =
                    c.surface.centre[e].z > -1e-6 ? 0.3 : scale * (bin[e] % 3 == 0 ? 0.25 : 0.05);
            return s;
        };
        const auto walk = tests::forward_walk(c.domain, c.surface, caster, sticking(1), bin, bins,
                                              {600000, 11, 1});
        std::unique_ptr<fluxes::ExactExchange> exact;
        if (c.domain.extruded())
            exact = std::make_unique<fluxes::ExactExchange>(c.domain, c.surface, caster,
                                                            std::vector<int>{});
        const auto gather = [&](double scale) {
            std::vector<std::vector<double>> value(bins);
            for (int r = 0; r < scrambles; ++r) {
                const auto flux = c.domain.extruded() ? exact->solve(sticking(scale))
                                                      : Exchange(c.domain, c.surface, caster,
                                                                 {64, 3, std::uint64_t(r)})
                                                            .solve(sticking(scale), -1, {});
                std::vector<double> sum(bins, 0), area(bins, 0);
                for (std::size_t e = 0; e < flux.size(); ++e)
                    if (bin[e] >= 0)
                        sum[bin[e]] += c.surface.area[e] * flux[e],
                            area[bin[e]] += c.surface.area[e];
                for (int b = 0; b < bins; ++b)
                    value[b].push_back(sum[b] / area[b]);
            }
            std::vector<double> pulls;
            for (int b = 0; b < bins; ++b) {
                const tests::Mean mean(value[b]);
                const double error = exact ? 0 : mean.error;
                pulls.push_back((walk.flux[b] - mean.value) / std::hypot(error, walk.error[b]));
            }
            return tests::Pulls(pulls);
        };
        const tests::Pulls pulls = gather(1);
        INFO(c.name << ": chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest
                    << " mean " << pulls.mean);
        CHECK(pulls.agree());
        CHECK_FALSE(gather(1.1).agree());
    }
}
