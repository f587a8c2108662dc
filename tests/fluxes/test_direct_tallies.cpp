// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"
#include "fluxes/open_sky.hpp"
#include "tests/support/brute_caster.hpp"
#include "tests/support/one_ion.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <cmath>
#include <functional>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Sides;
using geometry::Surface;
using tests::degree;
using tests::OneIon;
using tests::per_ion;
using tests::pi;

namespace {

double integral(const std::function<double(double)>& f, double from, double to, int n) {
    double sum = 0;
    for (int i = 0; i < n; ++i)
        sum += f(from + (to - from) * (i + 0.5) / n);
    return sum * (to - from) / n;
}

/// Flux per length on a facet of normal angle psi lit between in-plane angles, Gaussian slopes.
double lit(double psi, double low, double high, double sigma) {
    const double from = std::tan(std::max(low, psi - 0.5 * pi + 1e-12));
    const double to = std::min(std::tan(std::min(high, 0.49 * pi)), 12 * sigma);
    return integral(
        [&](double t) {
            return (std::cos(psi) + t * std::sin(psi)) * std::exp(-0.5 * t * t / sigma / sigma) /
                   (sigma * std::sqrt(2 * pi));
        },
        std::max(from, -12 * sigma), to, 4000);
}

} // namespace

TEST_CASE("direct ions, extruded: element by element against a plain ray search", "[direct]") {
    // Oracle: share of 400 points of each segment that a plain search of all segments finds open.
    // Source: independent code (no strings, no unwrapped angles).
    // Tolerance: 1/400 of the segment at each shadow edge, so 0.006 of the largest flux.
    const Domain d = [] {
        Domain domain;
        domain.cells_x = 80;
        return domain;
    }();
    Domain domain = d;
    domain.sides = GENERATE(Sides::mirror, Sides::periodic);
    const Surface s = tests::polyline(domain,
                                      {{-40, 0, 0},
                                       {-12, 0, 0},
                                       {-14, 0, -10},
                                       {-30, 0, -14},
                                       {-34, 0, -40},
                                       {-22, 0, -52},
                                       {-20, 0, -30},
                                       {-18, 0, -55},
                                       {0, 0, -60},
                                       {18, 0, -56},
                                       {26, 0, -20},
                                       {12, 0, -8},
                                       {16, 0, 3},
                                       {30, 0, -6},
                                       {40, 0, 0}},
                                      4.0);
    const OpenSky sky(domain, s);
    for (double tilt : {-71.0, -38.0, -11.0, 0.0, 13.0, 42.0, 66.0}) {
        const double phi = tilt * degree;
        const InPlane plane =
            resolve_in_plane(IonBeam{100, Vec3(-std::sin(phi), 0, -std::cos(phi))});
        for (int e = 0; e < int(s.size()); ++e) {
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const double facing =
                (s.normal[e].x * std::sin(phi) + s.normal[e].z * std::cos(phi)) / std::cos(phi);
            int open = 0;
            if (facing > 0)
                for (int i = 0; i < 400; ++i)
                    open +=
                        tests::brute_hit(domain, s, a + (b - a) * ((i + 0.5) / 400), phi, e, 8) < 0;
            CAPTURE(tilt, e, s.centre[e].x, s.centre[e].z);
            CHECK(std::fabs(sky.flux(plane, e) - std::max(facing, 0.0) * open / 400) <
                  0.006 * std::max(1.0, std::fabs(facing)));
        }
    }
}

TEST_CASE("direct ions, extruded: walls a few beam spreads from vertical", "[direct]") {
    // Oracle: quadrature of the Gaussian slopes over the visible interval, walls tilted 0.2, 1.15,
    //         3 deg, spread 1 deg; also with the normal turned by -2 to 2 deg at the same
    //         visibility.
    // Source: definition of the flux, integrated with 4,000 points.
    // Tolerance: 1 % of the wall's own value; the untilted wall's value must fail.
    const double sigma = 1 * degree, floor = 60, depth = 300;
    for (double tilt : {0.2, 1.15, 3.0}) {
        Domain d;
        d.cells_x = 160;
        const Surface s = tests::leaning_trench(d, floor, depth, tilt * degree, 1.0);
        const OneIon one(d, s, IonDistribution::gaussian(100, sigma), 2.0);
        const tests::TabulatedIons& ions = one.ions;
        double sum = 0, exact_sum = 0;
        for (std::size_t e = 0; e < s.size(); ++e) {
            const Vec3 c = s.centre[e];
            if (c.x > 0 || s.normal[e].x < 0.5 || c.z < -depth + 5 || c.z > -5) continue;
            const double psi = std::atan2(s.normal[e].x, s.normal[e].z);
            const double top = 0.5 * floor + depth * std::tan(tilt * degree);
            const double right = std::atan2(top - c.x, -c.z);
            const double exact = 2 * lit(psi, psi - 0.5 * pi, right, sigma);
            CAPTURE(tilt, c.z);
            CHECK(ions.tally(0, int(e)) == Approx(exact).epsilon(0.01));
            CHECK(ions.flux(0, int(e)) == Approx(exact).epsilon(0.01));
            for (double turn : {-2.0, -0.7, 0.7, 2.0}) {
                const double turned = psi + turn * degree;
                const double expected = 2 * lit(turned, psi - 0.5 * pi, right, sigma);
                CHECK(std::fabs(ions.tally_at(0, int(e), turned) - expected) <
                      0.01 * expected + 0.01 * exact);
            }
            sum += ions.tally(0, int(e));
            exact_sum += 2 * lit(0.5 * pi, 0, right, sigma);
        }
        CHECK(sum != Approx(exact_sum).epsilon(0.01));
    }
}

TEST_CASE("direct ions, extruded: first-step rate of a vertical wall", "[direct]") {
    // Oracle: (sigma / sqrt(2 pi)) [1 - exp(-w^2 / (2 sigma^2 z^2))] at depth z, 5-cell bins.
    // Source: Gaussian slopes integrated over the visible interval, derived here.
    // Tolerance: 3 % per bin for 1, 2 and 4 deg.
    const double width = 60, depth = 400;
    for (double spread : {1.0, 2.0, 4.0}) {
        Domain d;
        d.spacing = 2;
        d.cells_x = 60;
        const Surface s = tests::trench(d, width, depth, 2.0);
        const double sigma = spread * degree;
        const OneIon one(d, s, IonDistribution::gaussian(100, sigma));
        const tests::TabulatedIons& ions = one.ions;
        std::vector<double> bin(40, 0.0), area(40, 0.0), exact(40, 0.0);
        for (std::size_t e = 0; e < s.size(); ++e) {
            const Vec3 c = s.centre[e];
            if (s.normal[e].x < 0.5) continue;
            const int b = static_cast<int>(-c.z / 10);
            bin[b] += ions.tally(0, int(e)) * s.area[e];
            area[b] += s.area[e];
            const double x = width / (sigma * -c.z);
            exact[b] += s.area[e] * sigma / std::sqrt(2 * pi) * -std::expm1(-0.5 * x * x);
        }
        for (int b = 0; b < 40; ++b) {
            CAPTURE(spread, b);
            CHECK(bin[b] == Approx(exact[b]).epsilon(0.03));
            CHECK(bin[b] != Approx(1.08 * exact[b]).epsilon(0.03));
        }
    }
}

namespace {

IonDistribution spread_law(int which) {
    const auto thermal = IonDistribution::thermal_fall(60, 2.0, 2.0);
    const auto histogram =
        IonDistribution::histogram({40, 60, 120}, {0, 5, 15, 30}, {{2, 3, 1}, {4, 1, 0.5}});
    const auto spectrum = IonDistribution::falling_spectrum({30, 60, 90, 240}, {2, 1, 3}, 1.0);
    switch (which) {
    case 0:
        return thermal;
    case 1:
        return histogram;
    case 2:
        return spectrum;
    case 3:
        return IonDistribution::mixture({1, 2}, {spectrum, histogram});
    case 4:
        return spectrum.tilted(4, 30);
    default:
        return thermal.tilted(12, 90);
    }
}

} // namespace

TEST_CASE("direct ions: tallies of a yield over an open plane", "[direct]") {
    // Oracle: flat open surface, normal turned to psi: sum over ions of (r.n)/r_z Y(E, r.n), summed
    // over
    //         200,000 samples of the distribution.
    // Source: definition; sampling code is independent of the in-plane nodes.
    // Tolerance: 1.5 % (sampling error below 0.5 % where the tally is not small).
    Domain d;
    d.cells_x = 20;
    const Surface s = tests::polyline(d, {{-10, 0, 0}, {10, 0, 0}}, 1.0);
    const auto ions = spread_law(GENERATE(range(0, 6)));
    const YieldFunction yield{SquareRootLaw{0.02, 45}, YamamuraAngle{2.2, 62}, 1.0};
    const OneIon one(d, s, ions, 3.0, yield);
    const tests::TabulatedIons& direct = one.ions;
    for (double psi : {0.0, 20.0, 45.0, 63.0, 75.0}) {
        double sum = 0;
        const int count = 200000;
        for (int i = 0; i < count; ++i) {
            // A lattice of rank one, unlike the nested points of the program.
            const auto u = [&](double g) { return std::fmod(0.5 + i * g, 1.0); };
            const IonSample ion = ions.sample({u(0.8191725133961645), u(0.6710436067037893),
                                               u(0.5497004779019703), u(0.4503142577212985)});
            const double c = -(ion.direction.x * std::sin(psi * degree) +
                               ion.direction.z * std::cos(psi * degree));
            if (c > 0) sum += 3.0 * c / -ion.direction.z * yield(ion.energy_ev, c) / count;
        }
        CAPTURE(psi);
        CHECK(direct.tally_at(0, 10, psi * degree) == Approx(sum).epsilon(0.015));
        CHECK(direct.tally_at(0, 10, psi * degree) != Approx(1.04 * sum).epsilon(0.015));
    }
}

TEST_CASE("direct ions: rates linear between the rate angles", "[direct]") {
    // Oracle: the same tally at angles of a table four times as dense (quadrature on the nodes).
    // Source: definition of the flux.
    // Tolerance: 1e-3 of the floor's value anywhere; 1 % of the wall's within 3 spreads of
    // vertical.
    Domain d;
    d.cells_x = 20;
    const Surface s = tests::polyline(d, {{-10, 0, 0}, {10, 0, 0}}, 1.0);
    for (double spread : {0.5, 1.0, 4.0}) {
        const double sigma = std::tan(spread * degree);
        const OneIon one(d, s, IonDistribution::gaussian(100, sigma));
        const tests::TabulatedIons& ions = one.ions;
        const auto angles = ions.rate_angles();
        CHECK(angles.size() <= 240);
        CHECK(angles.front() == -pi);
        CHECK(angles.back() == pi);
        for (std::size_t k = 1; k < angles.size(); ++k)
            REQUIRE(angles[k] > angles[k - 1]);
        for (double psi = -150; psi <= 150; psi += 0.0931) {
            // Open to all angles: sigma * (pdf(x) + x cdf(x)) sin + ..., x = cot(psi) / sigma.
            const double p = std::fabs(psi) * degree, x = std::cos(p) / std::sin(p) / sigma;
            const double exact = p == 0 ? 1.0
                                        : sigma * std::sin(p) *
                                              (std::exp(-0.5 * x * x) / std::sqrt(2 * pi) +
                                               x * 0.5 * std::erfc(-x / std::sqrt(2.0)));
            const double got = ions.tally_at(0, 10, psi * degree);
            CAPTURE(spread, psi);
            CHECK(std::fabs(got - exact) < 1e-3);
            if (std::fabs(90 - std::fabs(psi)) < 3 * spread)
                CHECK(std::fabs(got - exact) < 0.01 * sigma / std::sqrt(2 * pi) + 0.01 * exact);
        }
    }
}

TEST_CASE("direct ions: conservative rates on a rough wall", "[direct]") {
    // Oracle: a wall with 0.3 deg of alternating tilt collects what the smooth wall collects.
    // Source: conservation: the flux through a wall depends on its ends.
    // Tolerance: 1 % of the wall's total tally; 3 % per element, where single normals are off by 80
    // %.
    Domain d;
    d.cells_x = 120;
    const double depth = 300;
    const auto wall = [&](double bump) {
        std::vector<Vec3> points = {{-60, 0, 0}, {-30, 0, 0}};
        for (int i = 1; i < 300; ++i)
            points.push_back({-30 + bump * ((i * 7) % 5 - 2), 0, -double(i)});
        for (const Vec3& p :
             {Vec3(-30, 0, -depth), Vec3(30, 0, -depth), Vec3(30, 0, 0), Vec3(60, 0, 0)})
            points.push_back(p);
        return tests::polyline(d, points, 1.01);
    };
    const Surface smooth = wall(0), rough = wall(0.0018);
    const auto law = IonDistribution::gaussian(100, 1 * degree);
    const OneIon on_smooth(d, smooth, law), on_rough(d, rough, law);
    const tests::TabulatedIons &flat = on_smooth.ions, &bumpy = on_rough.ions;
    REQUIRE(smooth.size() == rough.size());
    double total = 0, expected = 0, worst = 0, noise = 0;
    for (std::size_t e = 0; e < smooth.size(); ++e) {
        const Vec3 c = smooth.centre[e];
        if (smooth.normal[e].x < 0.5 || c.z > -8 || c.z < -292) continue;
        total += bumpy.tally(0, int(e));
        expected += flat.tally(0, int(e));
        worst = std::max(worst, std::fabs(bumpy.tally(0, int(e)) / flat.tally(0, int(e)) - 1));
        noise = std::max(noise, std::fabs(bumpy.flux(0, int(e)) / flat.flux(0, int(e)) - 1));
    }
    CAPTURE(total / expected, worst, noise);
    CHECK(total == Approx(expected).epsilon(0.01));
    CHECK(noise > 0.2);
    CHECK(worst < 0.25 * noise);
}

TEST_CASE("ion tables serve the plasma they were built for, and no other", "[direct]") {
    // Oracle: the inputs themselves.  Source: definition.  Tolerance: none.
    const auto symmetry = geometry::Symmetry::extruded;
    const auto source = [](double drop, double flux) {
        return std::vector<IonSource>{
            {"X+", 40, flux, IonDistribution::thermal_fall(drop, 0.2, 0.2)}};
    };
    const std::vector<Tally> tallies = {{0, per_ion}};
    const IonTables tables(symmetry, source(100, 1), tallies);
    CHECK(tables.serves(symmetry, source(100, 1), tallies));
    CHECK_FALSE(tables.serves(symmetry, source(101, 1), tallies));
    CHECK_FALSE(tables.serves(symmetry, source(100, 2), tallies));
    CHECK_FALSE(tables.serves(geometry::Symmetry::full, source(100, 1), tallies));
    CHECK_FALSE(
        tables.serves(symmetry, source(100, 1), {{0, {ConstantLaw{1}, PlateauCosine{}, 1}}}));
    CHECK_FALSE(tables.serves(symmetry, source(100, 1), {}));
}

TEST_CASE("direct ions: same bits for any number of threads", "[direct]") {
    // Oracle: one thread.  Source: disjoint outputs.  Tolerance: none.
    Domain d;
    d.cells_x = 80;
    const Surface s = tests::trench(d, 40, 120, 1.0);
    const auto run = [&](int threads) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        const OneIon one(d, s, IonDistribution::thermal_fall(100, 0.3, 0.3), 1,
                         {SquareRootLaw{0.1, 20}, YamamuraAngle{}, 1});
        const tests::TabulatedIons& ions = one.ions;
        std::vector<double> all;
        for (std::size_t e = 0; e < s.size(); ++e) {
            all.push_back(ions.flux(0, int(e)));
            all.push_back(ions.tally(0, int(e)));
            all.push_back(ions.tally_at(0, int(e), 1.3));
        }
        return all;
    };
    const auto one = run(1);
    CHECK(run(2) == one);
    CHECK(run(4) == one);
}
