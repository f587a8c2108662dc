// SPDX-License-Identifier: Apache-2.0
// Ions and neutrals in a round feature in r and z.
#include "fluxes/arc_average.hpp"
#include "fluxes/direct_ions.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/reflected_ions.hpp"
#include "tests/support/csv_table.hpp"
#include "tests/support/forward_ions.hpp"
#include "tests/support/forward_walk.hpp"
#include "tests/support/one_ion.hpp"
#include "tests/support/revolved_shapes.hpp"
#include "tests/support/statistics.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <cmath>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Surface;
using tests::degree;
using tests::OneIon;
using tests::per_ion;
using tests::pi;
using tests::round_cell;
using tests::round_hole;

namespace {

/// The flux on each element, by refreshes of `directions` each.
std::vector<tests::Mean> fluxes_of(const Domain& d, const Surface& s, const IonDistribution& ions,
                                   int directions) {
    constexpr int refreshes = 24;
    std::vector<std::vector<double>> value(s.size());
    const geometry::RayCaster caster(d, s, 10);
    const auto tables = std::make_shared<IonTables>(
        d.symmetry, std::vector<IonSource>{{"X+", 40, 1, ions}}, std::vector<Tally>{{0, per_ion}});
    for (int r = 0; r < refreshes; ++r) {
        const tests::TabulatedIons direct(d, s, caster, tables, {directions, 7, std::uint64_t(r)});
        for (std::size_t e = 0; e < s.size(); ++e)
            value[e].push_back(direct.flux(0, int(e)));
    }
    std::vector<tests::Mean> means;
    for (const auto& of_element : value)
        means.emplace_back(of_element);
    return means;
}

/// Mean over an element of a law, by area.
template <class Law>
double over_element(const Surface& s, int e, Law law) {
    const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
    double sum = 0, area = 0;
    for (int i = 0; i < 20; ++i) {
        const Vec3 p = a + (b - a) * ((i + 0.5) / 20);
        sum += p.x * law(p);
        area += p.x;
    }
    return sum / area;
}

/// A bowed hole with a neck under its rim.
Surface necked(const Domain& d) {
    std::vector<Vec3> points{{0, 0, -50}, {9, 0, -50}};
    for (int i = 1; i < 10; ++i)
        points.push_back({9 + 4 * std::sin(pi * i / 10), 0, -50 + 4.5 * i});
    points.insert(points.end(), {{9, 0, -5}, {11, 0, 0}, {d.width_x(), 0, 0}});
    return tests::frusta(d, points, 2);
}

} // namespace

TEST_CASE("averages over the arc of a round feature keep sums and constants", "[revolved][flux]") {
    // Oracle: a constant stays; the sum of value times area is kept; an element on the axis is
    // averaged over as much arc as any other.
    // Source: definition. Tolerance: 1e-12; 1e-9 of the sum (what rounds of scaling leave).
    const Domain d = round_cell(24);
    const Surface s =
        tests::frusta(d, {{0, 0, -30}, {8, 0, -31}, {10, 0, -12}, {11, 0, 0}, {24, 0, 0}}, 0.83);
    const ArcAverage average = arc_average(d, s);
    std::vector<double> value(s.size()), ones(s.size(), 1.0);
    double before = 0, after = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        value[e] = 1 + std::sin(1.7 * e);
        before += s.area[e] * value[e];
    }
    for (std::size_t e = 0; e < s.size(); ++e) {
        after += s.area[e] * average.of(value, int(e));
        CHECK(average.of(ones, int(e)) == Approx(1).epsilon(1e-12));
        double own = 0;
        for (int i = average.first[e]; i < average.first[e + 1]; ++i)
            if (average.parts[i].element == int(e)) own += average.parts[i].weight;
        CHECK(own < 0.5);
    }
    CHECK(after == Approx(before).epsilon(1e-9));
}

TEST_CASE("averages over the arc of a round feature do not jump where a bend becomes a corner",
          "[revolved][flux]") {
    // Oracle: the average follows the shape smoothly: a floor at 1 whose outer part, at 0, falls
    // away by an angle about any at which a corner may be said to begin.
    // Source: a contour that moves bends a little more or less from step to step (derived here).
    // Tolerance: 0.02 per half degree, all of the step between 10 and 50 degrees; an average that
    // ends at 30 degrees (extruded) must fail.
    const auto largest_jump = [](const Domain& d, double left, double& all) {
        double largest = 0, before = 0, first = 0;
        for (double angle = 10; angle <= 50; angle += 0.5) {
            const double c = std::cos(angle * degree), sine = std::sin(angle * degree);
            const Surface s = d.revolved() ? tests::frusta(d,
                                                           {{0, 0, -10},
                                                            {6, 0, -10},
                                                            {6 + 8 * c, 0, -10 - 8 * sine},
                                                            {16, 0, 0},
                                                            {d.width_x(), 0, 0}},
                                                           1)
                                           : tests::polyline(d,
                                                             {{left, 0, 0},
                                                              {-8, 0, -10},
                                                              {0, 0, -10},
                                                              {8 * c, 0, -10 - 8 * sine},
                                                              {12, 0, 0},
                                                              {-left, 0, 0}},
                                                             1);
            const double bend = d.revolved() ? 6 : 0;
            std::vector<double> value(s.size());
            int edge = -1;
            for (std::size_t e = 0; e < s.size(); ++e) {
                value[e] = s.normal[e].z > 0.999 && s.centre[e].z < -9 ? 1 : 0;
                if (value[e] == 1 && s.centre[e].x < bend) edge = int(e);
            }
            const double average = arc_average(d, s).of(value, edge);
            if (angle > 10) largest = std::max(largest, std::fabs(average - before));
            if (angle == 10) first = average;
            before = average;
        }
        all = before - first;
        return largest;
    };
    double all = 0;
    CHECK(largest_jump(round_cell(24), 0, all) < 0.02);
    CHECK(all > 0.2);
    Domain flat;
    flat.cells_x = 40;
    CHECK(largest_jump(flat, -20, all) > 0.1);
}

TEST_CASE("direct ions in a round hole against closed forms", "[revolved][direct]") {
    // Oracle: cosine law: floor at r (1 - (r^2 + L^2 - R^2) / sqrt((r^2 + L^2 - R^2)^2 +
    // 4 L^2 R^2)) / 2, wall at depth z (X^2 + 1/2) / sqrt(X^2 + 1) - X with X = z / 2R.
    // Source: closed forms of disc view factors (derived here).
    // Tolerance: rings: chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean < 4/sqrt(n);
    // 2 % faults must fail.
    const Domain d = round_cell(20);
    const double R = 10, L = 20;
    const Surface s = round_hole(d, R, L, 1.25);
    const auto law = [&](int e) {
        return over_element(s, e, [&](const Vec3& p) {
            if (s.normal[e].z > 0.5) {
                const double k = p.x * p.x + L * L - R * R;
                return 0.5 * (1 - k / std::sqrt(k * k + 4 * L * L * R * R));
            }
            const double x = -p.z / (2 * R);
            return (x * x + 0.5) / std::sqrt(x * x + 1) - x;
        });
    };
    const auto flux = fluxes_of(d, s, IonDistribution::thermal_fall(0, 1, 1), 1024);
    const auto compare = [&](double scale) {
        std::vector<double> pulls;
        for (std::size_t e = 0; e < s.size(); ++e)
            if (s.centre[e].x <= R && flux[e].error > 0)
                pulls.push_back((flux[e].value - scale * law(int(e))) / flux[e].error);
        return tests::Pulls(pulls);
    };
    const tests::Pulls pulls = compare(1);
    INFO("chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest << " mean "
                    << pulls.mean);
    CHECK(pulls.count > 20);
    CHECK(pulls.agree());
    CHECK_FALSE(compare(1.02).agree());
    CHECK_FALSE(compare(0.98).agree());
}

TEST_CASE("ions of a narrow beam on floor and wall of a round hole", "[revolved][direct]") {
    // Oracle: average of the floor from the table; what does not reach the floor lands on the wall.
    // Source: closed form (Bessel functions), computed table; balance.
    // Tolerance: 4 standard errors, those < 0.5 % of the floor and < 3 % of the wall; 3 % (floor)
    // and 10 % (wall) off must fail.
    const Domain d = round_cell(20);
    for (auto& row : tests::csv_table("direct_flux_gaussian.csv")) {
        if (row["sigma_deg"] != 1 || (row["AR"] != 10 && row["AR"] != 20)) continue;
        const double L = 20 * row["AR"], sigma = row["sigma_deg"] * degree;
        const Surface s = round_hole(d, 10, L, 2);
        const OneIon one(d, s, IonDistribution::gaussian(100, sigma), 1, per_ion, {4096, 1, 0});
        const tests::Mean floor = tests::batch_average(
            s, [&](int b, int e) { return one.ions.tally_batch(b, 0, e); },
            [&](const Vec3& c) { return c.z < -L + 1e-6; });
        const double expected = row["cyl_avg"];
        CAPTURE(row["AR"], floor.value, floor.error, expected);
        CHECK(floor.error < 0.005 * expected);
        CHECK(std::fabs(floor.value - expected) < 4 * floor.error);
        CHECK(std::fabs(floor.value - 1.03 * expected) > 4 * floor.error);
        const tests::Mean wall = tests::batch_average(
            s, [&](int b, int e) { return one.ions.tally_batch(b, 0, e); },
            [&](const Vec3& c) { return c.x > 9.9 && c.x < 10.1 && c.z < 0; });
        const double on_wall = (1 - expected) * 10 / (2 * L);
        CAPTURE(wall.value, wall.error, on_wall);
        CHECK(wall.error < 0.03 * on_wall);
        CHECK(std::fabs(wall.value - on_wall) < 4 * wall.error);
        CHECK(std::fabs(wall.value - 1.1 * on_wall) > 4 * wall.error);
    }
}

TEST_CASE("reflected ions in a round hole against forward walks", "[revolved][reflected]") {
    // Oracle: plain forward tracing of ions from the source plane, pseudo-random, no weights.
    // Source: independent code (only the ray caster and the laws of one reflection are shared).
    // Tolerance: 20 bins, chi2/nu within 1 +- 4 sqrt(2/nu), largest pull < 4.5, mean pull < 4 /
    // sqrt(n), errors of both sides added in squares; values 3 % off must fail.
    const Domain d = round_cell(20);
    const Surface s = necked(d);
    const geometry::RayCaster caster(d, s, 5);
    const IonSource source{"Ar+", 40, 1.0, IonDistribution::thermal_fall(100, 0.8, 0.4)};
    std::vector<IonReflection> laws(2);
    laws[1].target_mass_amu = 60;
    laws[1].critical_deg = 50;
    laws[1].scatter_deg = 8;
    std::vector<int> material;
    for (const Vec3& centre : s.centre)
        material.push_back(centre.z < -20 ? 1 : 0);
    constexpr int bins = 20, scrambles = 16;
    const auto bin = tests::bins_below(s, -1e-6, bins);
    const auto walk =
        tests::forward_ions(d, s, caster, source, laws, material, bin, bins, 2000000, 5);
    std::vector<std::vector<double>> value(bins);
    double lost = 0;
    for (int r = 0; r < scrambles; ++r) {
        const tests::TabulatedIons direct(d, s, caster, {source},
                                          {{0, {SquareRootLaw{1, 0}, FlatAngle{}, 1}}},
                                          {256, 3, std::uint64_t(r)});
        const ReflectedIons reflected = trace_reflected(d, s, caster, material, direct, laws,
                                                        {8192, 3, std::uint64_t(r), false});
        lost += reflected.lost_share;
        std::vector<double> sum(bins, 0), area(bins, 0);
        for (std::size_t e = 0; e < s.size(); ++e) {
            if (bin[e] < 0) continue;
            area[bin[e]] += s.area[e];
            for (int b = 0; b < batches; ++b)
                sum[bin[e]] +=
                    s.area[e] * tests::reflected_tally(reflected, b, 0, int(e)) / batches;
        }
        for (int b = 0; b < bins; ++b)
            value[b].push_back(sum[b] / area[b]);
    }
    const auto compare = [&](double scale) {
        std::vector<double> pulls;
        for (int b = 0; b < bins; ++b) {
            const tests::Mean mean(value[b]);
            if (walk.value[b] == 0 && mean.value == 0) continue;
            pulls.push_back((walk.value[b] - scale * mean.value) /
                            std::hypot(mean.error, walk.error[b]));
        }
        return tests::Pulls(pulls);
    };
    const tests::Pulls pulls = compare(1);
    INFO("chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest << " mean "
                    << pulls.mean);
    CHECK(pulls.agree());
    CHECK(lost < 1e-5);
    CHECK(caster.lost() == 0);
    CHECK_FALSE(compare(1.03).agree());
    CHECK_FALSE(compare(0.97).agree());
}

TEST_CASE("sampled neutrals in a round hole: equilibrium and forward walks",
          "[revolved][exchange]") {
    // Oracle: flux 1 everywhere without sticking; forward random walks with it.
    // Source: equilibrium of a closed cavity (derived here); independent code.
    // Tolerance: 1e-8; 15 bins by pulls as above over 16 scrambles, 3 % off must fail.
    const Domain d = round_cell(20);
    const Surface s = necked(d);
    const geometry::RayCaster caster(d, s, 5);
    std::vector<double> sticking(s.size(), 0.0);
    constexpr int bins = 15, scrambles = 16;
    const auto bin = tests::bins_below(s, -1e-6, bins);
    std::vector<std::vector<double>> value(bins);
    for (int r = 0; r < scrambles; ++r) {
        const Exchange exchange(d, s, caster, {512, 3, std::uint64_t(r)});
        if (r == 0)
            for (const double flux : exchange.solve(sticking, -1, {}))
                CHECK(flux == Approx(1).epsilon(1e-8));
        for (std::size_t e = 0; e < s.size(); ++e)
            sticking[e] = s.centre[e].z < -49.9 ? 0.5 : s.centre[e].z < 0 ? 0.1 : 0;
        const auto flux = exchange.solve(sticking, -1, {});
        std::vector<double> sum(bins, 0), area(bins, 0);
        for (std::size_t e = 0; e < s.size(); ++e)
            if (bin[e] >= 0) sum[bin[e]] += s.area[e] * flux[e], area[bin[e]] += s.area[e];
        for (int b = 0; b < bins; ++b)
            value[b].push_back(sum[b] / area[b]);
    }
    const auto walk = tests::forward_walk(d, s, caster, sticking, bin, bins, {1000000, 9, 1});
    const auto compare = [&](double scale) {
        std::vector<double> pulls;
        for (int b = 0; b < bins; ++b) {
            const tests::Mean mean(value[b]);
            pulls.push_back((walk.flux[b] - scale * mean.value) /
                            std::hypot(mean.error, walk.error[b]));
        }
        return tests::Pulls(pulls);
    };
    const tests::Pulls pulls = compare(1);
    INFO("chi2/nu " << pulls.chi2_per_bin << " largest " << pulls.largest << " mean "
                    << pulls.mean);
    CHECK(pulls.agree());
    CHECK_FALSE(compare(1.03).agree());
    CHECK_FALSE(compare(0.97).agree());
}

TEST_CASE("ions in a round hole: same bits for any number of threads", "[revolved][direct]") {
    // Oracle: one thread.  Source: disjoint outputs.  Tolerance: none.
    const Domain d = round_cell(20);
    const Surface s = necked(d);
    const auto run = [&](int threads) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        const OneIon one(d, s, IonDistribution::thermal_fall(100, 0.3, 0.3), 1, per_ion,
                         {32, 1, 0});
        const geometry::RayCaster caster(d, s, 5);
        const auto reflected = trace_reflected(d, s, caster, std::vector<int>(s.size(), 0),
                                               one.ions, {IonReflection{}}, {512, 3, 0});
        std::vector<double> all;
        for (std::size_t e = 0; e < s.size(); ++e) {
            all.push_back(tests::reflected_tally(reflected, 3, 0, int(e)));
            all.push_back(one.ions.tally_at(0, int(e), -1.3));
        }
        return all;
    };
    const auto one = run(1);
    CHECK(run(2) == one);
    CHECK(run(4) == one);
}
