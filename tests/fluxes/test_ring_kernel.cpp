// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupling.hpp"
#include "fluxes/exact_exchange.hpp"
#include "fluxes/ring_kernel.hpp"
#include "fluxes/sampling.hpp"
#include "tests/support/round_cavities.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>

using namespace rille;
using namespace rille::fluxes;

namespace {

constexpr double pi = 3.14159265358979323846;

/// cos cos / (pi distance^2) over pi, where both face, and the same without a sign: by the middles
/// of many steps of v with azimuth = 2 peak sinh(v).
struct ByHand {
    double value = 0, size = 0;

    ByHand(const RingPoint& p, const RingPoint& q) {
        const double dz = q.at.z - p.at.z, near = std::hypot(q.at.x - p.at.x, dz);
        const double peak = near / std::sqrt(4 * p.at.x * q.at.x);
        const double top = std::asinh(pi / (2 * peak));
        constexpr int steps = 20000;
        for (int i = 0; i < steps; ++i) {
            const double v = top * (i + 0.5) / steps, azimuth = 2 * peak * std::sinh(v);
            const double half = std::sin(0.5 * azimuth), c = 1 - 2 * half * half;
            const double d2 = near * near + 4 * p.at.x * q.at.x * half * half;
            const double one = p.normal.z * dz + p.normal.x * (q.at.x * c - p.at.x);
            const double two = -q.normal.z * dz + q.normal.x * (p.at.x * c - q.at.x);
            const double step = 2 * peak * std::cosh(v) * top / steps / (pi * pi * d2 * d2);
            if (one > 0 && two > 0) value += one * two * step;
            size += std::fabs(one * two) * step;
        }
    }
};

RingPoint shifted(RingPoint p, double share) {
    p.at.z += share * p.at.x;
    return p;
}

/// An operator that does not let on that it goes through places.
class Plain : public ExchangeOperator {
public:
    explicit Plain(const ExchangeOperator& own) : own_(own) {}
    std::size_t size() const override { return own_.size(); }
    void apply(int batch, const double* emitted, double* arrival) const override {
        own_.apply(batch, emitted, arrival);
    }
    const std::vector<double>& direct(int batch = -1) const override { return own_.direct(batch); }
    bool sampled() const override { return own_.sampled(); }

private:
    const ExchangeOperator& own_;
};

} // namespace

TEST_CASE("exchange of two rings in closed form", "[exact][revolved]") {
    // Oracle: the same integral over the azimuth by 20,000 steps.
    // Source: definition of the factor between two surface elements.
    // Tolerance: 1e-6 of the integral of its absolute value (of the steps where facing ends); one
    // ring moved up by 2 % of its radius must be off by more in most pairs.
    const ScrambledPoints points(7);
    int seen = 0, missed = 0;
    for (std::uint32_t i = 0; i < 400; ++i) {
        const auto a = points.four(i);
        const auto b = points.pair(i, 2);
        const auto ring = [](double r, double z, double lean) {
            return RingPoint{{r, z}, {std::cos(lean), std::sin(lean)}};
        };
        // Radii of 0.3 to 30, heights apart by 0.001 to 3,000.
        const RingPoint p = ring(0.3 * std::pow(100, a[0]), 0, 2 * pi * b[0]);
        const RingPoint q =
            ring(0.3 * std::pow(100, a[1]), 1e-3 * std::pow(3e6, a[2]), 2 * pi * b[1]);
        std::vector<CosineRange> scratch;
        const ByHand by_hand(p, q);
        const double own = ring_kernel(p, q, {}, scratch);
        const double moved = ring_kernel(shifted(p, 0.02), q, {}, scratch);
        CAPTURE(i, p.at.x, q.at.x, q.at.z, own, by_hand.value);
        CHECK(std::fabs(own - by_hand.value) <= 1e-6 * by_hand.size);
        if (!(by_hand.value > 0)) continue;
        ++seen;
        missed += std::fabs(moved - by_hand.value) > 1e-6 * by_hand.size;
    }
    CHECK(seen > 100);
    CHECK(missed > 0.9 * seen);
}

TEST_CASE("neutrals solved between places and between elements agree", "[exact][coupling]") {
    // Oracle: the same equations without the way through places.
    // Source: derived here.
    // Tolerance: 1e-7 of the open flux; the answer to a flux 0.1 % off must miss it.
    for (const tests::RoundCavity& c : tests::all_round_cavities()) {
        const geometry::RayCaster caster(c.domain, c.surface, 3.0);
        const ExactExchange exchange(c.domain, c.surface, caster, {});
        const std::vector<NeutralSupply> supply{{100, false, nullptr}, {300, false, nullptr}};
        // Each takes what the other leaves of the sites.
        const auto answer = [&](double fault) -> AnswerOf {
            return [&c, fault](int e, int, const double* flux) {
                const double one = 2e-2 * fault * flux[0], two = 5e-3 * flux[1];
                NeutralAnswer a;
                a.sticking[0] = (0.2 + 0.1 * std::sin(0.3 * c.surface.centre[e].z)) / (1 + two);
                a.sticking[1] = 0.4 / (1 + one + two);
                return a;
            };
        };
        const auto own = solve_coupled(exchange, supply, answer(1), {});
        const auto plain = solve_coupled(Plain(exchange), supply, answer(1), {});
        const auto other = solve_coupled(exchange, supply, answer(1.001), {});
        double off = 0, fault = 0;
        for (std::size_t k = 0; k < supply.size(); ++k)
            for (std::size_t e = 0; e < own.flux[k].size(); ++e) {
                const double open = supply[k].open;
                off = std::max(off, std::fabs(own.flux[k][e] - plain.flux[k][e]) / open);
                fault = std::max(fault, std::fabs(other.flux[k][e] - own.flux[k][e]) / open);
            }
        CAPTURE(c.name, off, fault);
        CHECK(off < 1e-7);
        CHECK(fault > 1e-7);
    }
}
