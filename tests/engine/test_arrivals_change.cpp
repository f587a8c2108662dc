// SPDX-License-Identifier: Apache-2.0
#include "engine/arrivals_change.hpp"
#include "fluxes/sampling.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

using namespace rille;

namespace {

/// Rates of one material that do not depend on the normal, on every element of a surface.
struct Arrivals {
    fluxes::SurfaceStep step;

    explicit Arrivals(const std::vector<double>& rate, double noise = 0, std::uint64_t seed = 1) {
        step.rates.angles = {-3.15, 3.15};
        step.rates.first_row.push_back(0);
        step.rate_batch.assign(8, rate);
        for (std::size_t e = 0; e < rate.size(); ++e) {
            double mean = 0;
            for (int b = 0; b < 8; ++b) {
                const double u = fluxes::unit_interval(fluxes::stream_key(seed, e, b));
                const double off = noise * std::sqrt(12.0) * (u - 0.5);
                step.rate_batch[b][e] += off;
                mean += off / 8;
            }
            step.rates.material.push_back(0);
            step.rates.first_row.push_back(static_cast<int>(e) + 1);
            step.rates.table.insert(step.rates.table.end(), 2, rate[e] + mean);
        }
    }
};

} // namespace

TEST_CASE("change of the arrivals between two surfaces") {
    // Oracle: a change of all rates by 3 %; the same under noise of 1 % a batch; noise alone of 10
    // % a batch; a jump to double the rate on a tenth of the surface. Source: the definition.
    // Tolerance: 1e-12 without noise, a sixth of the change with it; noise and the jump alone count
    // as nothing.
    geometry::Domain d;
    d.cells_x = 40;
    const auto s = tests::polyline(d, {{-20, 0, 0}, {20, 0, 0}}, 1);
    std::vector<geometry::BetweenCentres> feet(s.size());
    for (std::size_t e = 0; e < feet.size(); ++e)
        feet[e].element = static_cast<int>(e);
    const auto change = [&](const Arrivals& now, const Arrivals& later) {
        return engine::arrivals_change(d, s, now.step, later.step, feet);
    };
    const std::vector<double> before(s.size(), 2.0), after(s.size(), 2.06);
    CHECK(change(Arrivals(before), Arrivals(after)) == Approx(0.03).epsilon(1e-12));
    CHECK(change(Arrivals(before, 0.02, 1), Arrivals(after, 0.02, 2)) ==
          Approx(0.03).margin(0.005));
    CHECK(change(Arrivals(before, 0.2, 1), Arrivals(before, 0.2, 2)) == 0);
    std::vector<double> jumped = before;
    for (int e = 0; e < 4; ++e)
        jumped[e] *= 2;
    CHECK(change(Arrivals(before), Arrivals(jumped)) < 1e-12);
}
