// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupling.hpp"
#include "fluxes/exact_exchange.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/first_flight.hpp"
#include "tests/support/cavities.hpp"
#include "tests/support/emission_walk.hpp"
#include "tests/support/round_cavities.hpp"
#include "tests/support/statistics.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <cmath>
#include <memory>

using namespace rille;
using fluxes::FirstFlight;
using fluxes::NeutralAnswer;
using geometry::Domain;
using geometry::RayCaster;
using geometry::Surface;

namespace {

const double pi = std::acos(-1.0);

/// Share of what the floor of a slot emits by cos^n, n = 1 or 2, that goes through the mouth.
double slot_escape(double aspect, int n) {
    const auto up_to = [n](double a) { // integral of the in-plane law up to angle a
        return n == 1 ? 0.5 * std::sin(a) : (a + std::sin(a) * std::cos(a)) / pi;
    };
    double sum = 0;
    const int points = 2000;
    for (int i = 0; i < points; ++i) {
        const double x = (i + 0.5) / points;
        sum += up_to(std::atan((1 - x) / aspect)) - up_to(-std::atan(x / aspect));
    }
    return sum / points;
}

std::vector<double> some_emission(const Surface& s) {
    std::vector<double> emitted(s.size());
    for (std::size_t e = 0; e < s.size(); ++e)
        emitted[e] = 1 + std::sin(0.2 * s.centre[e].z) + (s.normal[e].z > 0.5 ? 2 : 0);
    return emitted;
}

struct Shape {
    std::string name;
    Domain domain;
    Surface surface;
};

Shape full_hole() {
    Domain d;
    d.symmetry = geometry::Symmetry::full;
    d.cells_x = d.cells_y = 24;
    std::vector<std::array<double, 2>> profile;
    for (int i = 0; i <= 12; ++i)
        profile.push_back({8 + 2 * std::sin(pi * i / 12), -1.5 * i});
    for (const double r : {6.0, 4.0, 2.0, 0.0})
        profile.push_back({r, -18 - 0.05 * (8 - r)});
    return {"full hole", d, tests::revolved_hole(d, profile, 32)};
}

} // namespace

TEST_CASE("weights of emission laws keep what is emitted", "[by_products]") {
    // Oracle: the mean weight over directions by the cosine law is 1, for any power.
    // Source: both laws are densities. Tolerance: 1e-3 (midpoints); half the weight must fail.
    for (const double n : {0.5, 1.0, 1.5, 2.0, 5.0}) {
        double round = 0, plane = 0;
        const int points = 20000;
        for (int i = 0; i < points; ++i) {
            const double u = (i + 0.5) / points;
            round += fluxes::emission_weight(n, std::sqrt(u), false) / points;
            plane +=
                fluxes::emission_weight(n, std::sqrt(1 - (2 * u - 1) * (2 * u - 1)), true) / points;
        }
        CAPTURE(n, round, plane);
        CHECK(round == Approx(1).epsilon(2e-3));
        CHECK(plane == Approx(1).epsilon(2e-3));
        CHECK(0.5 * round != Approx(1).epsilon(2e-3));
    }
    CHECK(slot_escape(2, 1) == Approx(std::sqrt(5) - 2).epsilon(1e-5));
}

TEST_CASE("a floor that emits by cos^2 loses more through the mouth", "[by_products]") {
    // Oracle: the plain integral of cos^2 over the mouth, averaged over the floor: at AR 2 28 %
    // against 24 % by the cosine law.
    // Source: derived here.
    // Tolerance: 4 standard errors from the 8 batches, which are below 1 %; the escape of the
    // cosine law must fail.
    for (const double aspect : {1.0, 2.0, 5.0}) {
        Domain d;
        d.cells_x = 40;
        const Surface s = tests::trench(d, 20, 20 * aspect, 1);
        const RayCaster caster(d, s, 2.0);
        const FirstFlight flight(d, s, caster, 2, {256, 1, 0});
        std::vector<double> emitted(s.size(), 0.0), arrived(s.size());
        double all = 0;
        for (std::size_t e = 0; e < s.size(); ++e)
            if (s.centre[e].z < -20 * aspect + 1e-6) all += s.area[e] * (emitted[e] = 1);
        std::vector<double> escape;
        for (int b = 0; b < fluxes::batches; ++b) {
            flight.apply(b, emitted.data(), arrived.data());
            double landed = 0;
            for (std::size_t e = 0; e < s.size(); ++e)
                landed += s.area[e] * arrived[e];
            escape.push_back(1 - landed / all);
        }
        const tests::Mean mean(escape);
        const double expected = slot_escape(aspect, 2);
        CAPTURE(aspect, mean.value, mean.error, expected);
        CHECK(mean.error < 0.01 * (1 - expected));
        CHECK(std::fabs(mean.value - expected) < 4 * mean.error + 1e-9);
        CHECK(std::fabs(mean.value - slot_escape(aspect, 1)) > 4 * mean.error);
    }
}

TEST_CASE("forward walks by other laws agree with the solution", "[by_products]") {
    // Oracle: forward random walks whose first flight is by cos^n, in all symmetries.
    // Source: derived here.
    // Tolerance: 20 bins, chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean pull <
    // 4/sqrt(n), seed fixed; errors of both sides in squares, that of the solution from 8 scrambles
    // of all rays. 2 % less emission must fail, and so must the cosine law.
    std::vector<Shape> shapes{full_hole()};
    for (const tests::Cavity& c : {tests::straight_trench(), tests::bowed_trench()})
        shapes.push_back({c.name, c.domain, c.surface});
    for (const tests::RoundCavity& c : tests::all_round_cavities())
        if (c.name == "bowed hole") shapes.push_back({c.name, c.domain, c.surface});
    for (const Shape& shape : shapes)
        for (const double power : {1.0, 2.0}) {
            const Surface& s = shape.surface;
            const bool full = !shape.domain.planar_contour();
            if (power == 1 && !full) continue; // exact: tested elsewhere
            const RayCaster caster(shape.domain, s, 1.0);
            const int bins = 20, scrambles = 8;
            const auto bin = tests::bins_below(s, -1e-6, bins);
            const auto emitted = some_emission(s);
            std::vector<double> sticking(s.size());
            for (std::size_t e = 0; e < s.size(); ++e)
                sticking[e] = bin[e] < 0 ? 0.5 : bin[e] % 3 == 0 ? 0.7 : 0.3;
            const auto walk = tests::emission_walk(shape.domain, s, caster, emitted, sticking, bin,
                                                   bins, {full ? 500000 : 1500000, 5, power});
            const fluxes::AnswerOf answer = [&](int e, int, const double*) {
                NeutralAnswer a;
                a.sticking[0] = sticking[e];
                a.emitted[0] = emitted[e];
                return a;
            };
            std::unique_ptr<fluxes::ExchangeOperator> exchange;
            if (!full)
                exchange = std::make_unique<fluxes::ExactExchange>(shape.domain, s, caster,
                                                                   std::vector<int>{});
            const auto gather = [&](double n, double fault) {
                std::vector<std::vector<double>> value(bins);
                for (int r = 0; r < scrambles; ++r) {
                    if (full)
                        exchange = std::make_unique<fluxes::Exchange>(
                            shape.domain, s, caster,
                            fluxes::Exchange::Options{64, 3, std::uint64_t(r)});
                    std::unique_ptr<FirstFlight> flight;
                    if (n != 1)
                        flight = std::make_unique<FirstFlight>(
                            shape.domain, s, caster, n,
                            FirstFlight::Options{64, 9, std::uint64_t(r)});
                    const auto found =
                        solve_coupled(*exchange, {{0, true, flight.get()}}, answer, {}).flux[0];
                    std::vector<double> sum(bins, 0), area(bins, 0);
                    for (std::size_t e = 0; e < s.size(); ++e)
                        if (bin[e] >= 0) {
                            sum[bin[e]] += fault * s.area[e] * found[e];
                            area[bin[e]] += s.area[e];
                        }
                    for (int b = 0; b < bins; ++b)
                        value[b].push_back(sum[b] / area[b]);
                }
                std::vector<double> pulls;
                for (int b = 0; b < bins; ++b) {
                    const tests::Mean mean(value[b]);
                    pulls.push_back((walk.flux[b] - mean.value) /
                                    std::hypot(mean.error, walk.error[b]));
                }
                return tests::Pulls(pulls);
            };
            const tests::Pulls right = gather(power, 1);
            INFO(shape.name << " n " << power << ": chi2/nu " << right.chi2_per_bin << " largest "
                            << right.largest << " mean " << right.mean);
            CHECK(right.agree());
            CHECK_FALSE(gather(power, 0.98).agree());
            if (power != 1) CHECK_FALSE(gather(1, 1).agree());
        }
}

TEST_CASE("first flights have the same bits for any number of threads", "[by_products]") {
    // Oracle: one thread. Source: definition. Tolerance: none; another seed must differ.
    const tests::Cavity c = tests::bowed_trench();
    const RayCaster caster(c.domain, c.surface, 1.0);
    const auto emitted = some_emission(c.surface);
    const auto land = [&](int threads, std::uint64_t seed) {
        const tbb::global_control control(tbb::global_control::max_allowed_parallelism, threads);
        const FirstFlight flight(c.domain, c.surface, caster, 1.5, {64, seed, 0});
        std::vector<double> arrived(c.surface.size());
        flight.apply(-1, emitted.data(), arrived.data());
        return arrived;
    };
    CHECK(land(1, 1) == land(3, 1));
    CHECK(land(1, 1) != land(1, 2));
}
