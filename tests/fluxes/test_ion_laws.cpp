// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/sampling.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180;

struct Arcsine {
    std::vector<double> edges, share;
};
/// Energies of a slow sine, 200 +- 150 eV, by the distribution function.
Arcsine arcsine(int bins) {
    const auto cdf = [](double e) {
        return 0.5 + std::asin(std::clamp((e - 200) / 150, -1.0, 1.0)) / pi;
    };
    Arcsine law;
    for (int i = 0; i <= bins; ++i)
        law.edges.push_back(50 + 300.0 * i / bins);
    for (int i = 0; i < bins; ++i)
        law.share.push_back(cdf(law.edges[i + 1]) - cdf(law.edges[i]));
    return law;
}

IonDistribution falling(double transverse_ev) {
    const Arcsine law = arcsine(200);
    return IonDistribution::falling_spectrum(law.edges, law.share, transverse_ev);
}

std::vector<IonSample> draw(const IonDistribution& ions, int count, std::uint64_t seed) {
    std::vector<IonSample> samples;
    for (int i = 0; i < count; ++i) {
        const auto u = [&](int d) { return unit_interval(stream_key(seed, i, d)); };
        samples.push_back(ions.sample({u(0), u(1), u(2), u(3)}));
    }
    return samples;
}

double slope_of(const IonSample& ion) {
    return ion.direction.x / ion.direction.z;
}

/// Largest pull over a row of thresholds of the sampled share against an expected one.
template <class Value, class Share>
double worst_pull(const std::vector<IonSample>& samples, const std::vector<double>& at, Value value,
                  Share expected) {
    double worst = 0;
    for (double x : at) {
        double below = 0;
        for (const IonSample& s : samples)
            below += value(s) <= x;
        const double p = std::clamp(expected(x), 0.0, 1.0), n = double(samples.size());
        worst = std::max(worst, std::fabs(below / n - p) / std::sqrt((p * (1 - p) + 1 / n) / n));
    }
    return worst;
}

const std::vector<double> angles = {-60, -30, -20, -10, -5, -3,  -2, -1, -0.5, 0,
                                    0.5, 1,   2,   3,   5,  7.5, 10, 15, 20,   40};

/// The in-plane resolution, the angles and the energies of a distribution against its samples.
void check_against_samples(const IonDistribution& ions, double tolerance = 4) {
    const auto samples = draw(ions, 200000, 11);
    const InPlane& plane = ions.in_plane();
    const auto in_plane_deg = [](const IonSample& s) { return std::atan(slope_of(s)) / degree; };
    CAPTURE(ions.mean_energy_ev(), ions.mean_rad(), ions.spread_rad());
    CHECK(worst_pull(samples, angles, in_plane_deg,
                     [&](double a) { return plane.share_below(a * degree); }) < tolerance);
    const auto polar = [](const IonSample& s) { return std::acos(-s.direction.z) / degree; };
    CHECK(worst_pull(samples, {0.5, 1, 2, 3, 5, 8, 12, 20, 30, 45, 60, 80}, polar,
                     [&](double a) { return ions.share_within_deg(a); }) < tolerance);
    double mean = 0, squares = 0, slope = 0, cosine = 0, node_energy = 0, node_cosine = 0;
    double slope_squares = 0, cosine_squares = 0;
    for (const IonSample& s : samples) {
        mean += s.energy_ev, squares += s.energy_ev * s.energy_ev;
        slope += slope_of(s), slope_squares += slope_of(s) * slope_of(s);
        cosine += -s.direction.z, cosine_squares += s.direction.z * s.direction.z;
    }
    const double n = double(samples.size());
    const auto error = [&](double sum, double square) {
        return std::sqrt(std::max(0.0, square / n - sum / n * sum / n) / n);
    };
    for (const InPlane::Node& node : plane.nodes) {
        for (const auto& part : plane.spectra[node.spectrum])
            node_energy += node.weight * part.share * part.energy_ev;
        node_cosine += node.weight * node.cos_polar;
    }
    CHECK(std::fabs(ions.mean_energy_ev() - mean / n) < tolerance * error(mean, squares) + 1e-9);
    CHECK(node_energy == Approx(ions.mean_energy_ev()).epsilon(1e-3));
    CHECK(std::fabs(node_cosine - cosine / n) < tolerance * error(cosine, cosine_squares) + 1e-3);
    CHECK(std::fabs(plane.moment.back() - slope / n) <
          tolerance * error(slope, slope_squares) + 1e-4);
}

} // namespace

TEST_CASE("a spectrum of falling ions: angles in closed form", "[ions][laws]") {
    // Oracle: F(th) = 1 - integral g(Ez) exp(-Ez tan^2 th / T) dEz; in the plane the slope is
    //         normal with variance T / (2 Ez); mean energy = mean of g plus T.
    // Source: thermal ions in free fall, derived here.
    // Tolerance: 1e-6 against a quadrature twenty times as fine; 1e-4 in the plane; the same with
    //            2 % on the temperature must fail.
    const double transverse = 0.5;
    const IonDistribution ions = falling(transverse);
    CHECK(ions.mean_energy_ev() == Approx(200 + transverse).epsilon(1e-9));
    const Arcsine law = arcsine(200);
    const auto integral = [&](auto value) {
        double sum = 0;
        for (std::size_t e = 0; e < law.share.size(); ++e)
            for (int i = 0; i < 20; ++i)
                sum += law.share[e] / 20 *
                       value(law.edges[e] + (law.edges[e + 1] - law.edges[e]) * (i + 0.5) / 20);
        return sum;
    };
    const auto off = [&](const IonDistribution& tested) {
        std::array<double, 2> worst{};
        for (double a = 0.05; a < 25; a *= 1.3) {
            const double t = std::tan(a * degree);
            const double share = integral([&](double e) { return -std::expm1(-e * t * t / 0.5); });
            worst[0] = std::max(worst[0], std::fabs(tested.share_within_deg(a) - share));
            for (double sign : {-1.0, 1.0}) {
                const double below = integral(
                    [&](double e) { return 0.5 * std::erfc(-sign * t * std::sqrt(e / 0.5)); });
                worst[1] = std::max(
                    worst[1], std::fabs(tested.in_plane().share_below(sign * a * degree) - below));
            }
        }
        return worst;
    };
    CHECK(off(ions)[0] < 1e-6);
    CHECK(off(ions)[1] < 1e-4);
    CHECK(off(falling(1.02 * transverse))[0] > 2e-3);
    CHECK(off(falling(1.02 * transverse))[1] > 2e-3);
    // One narrow bin is a beam that fell: the closed form of thermal ions.
    const auto narrow = IonDistribution::falling_spectrum({99.9, 100.1}, {3}, 0.2);
    const auto beam = IonDistribution::thermal_fall(100, 0.2, 0);
    CHECK(narrow.median_angle_deg() == Approx(beam.median_angle_deg()).epsilon(1e-5));
    CHECK(narrow.spread_rad() == Approx(beam.spread_rad()).epsilon(1e-4));
}

TEST_CASE("the new laws agree with their samples", "[ions][laws]") {
    // Oracle: 200,000 independent samples of the same distribution.
    // Source: the definition of the distributions.
    // Tolerance: 4 standard errors, plus 1e-3 on the mean cosine and 1e-4 on the mean slope.
    check_against_samples(falling(0.5));
    check_against_samples(IonDistribution::falling_spectrum({0, 5, 400}, {1, 2}, 0.3));
    const auto off = IonDistribution::thermal_fall(15.5, 0.3, 0.3);
    check_against_samples(IonDistribution::mixture({1, 3}, {falling(0.5), off}));
    const auto histogram = IonDistribution::histogram({5, 80}, {0, 4, 12}, {{2, 1}});
    check_against_samples(IonDistribution::mixture(
        {1, 1, 1}, {histogram, off, IonDistribution::mixture({2, 1}, {falling(0.5), histogram})}));
    for (double azimuth : {0.0, 90.0, 200.0}) {
        check_against_samples(falling(0.5).tilted(2.5, azimuth));
        check_against_samples(off.tilted(10, azimuth));
    }
    check_against_samples(histogram.tilted(20, 30));
    check_against_samples(falling(0.5).tilted(3, 10).tilted(4, 120));
    check_against_samples(IonDistribution::thermal_fall(0, 1, 1).tilted(30, 0));
    check_against_samples(IonDistribution::mixture({1, 2}, {falling(0.5), off}).tilted(5, 0));
}

TEST_CASE("tilted ions lean the way they are told", "[ions][laws]") {
    // Oracle: a beam along the normal, tilted, travels towards the azimuth; the flux comes from the
    //         other side; spectra without a lateral spread stay a beam.
    // Source: geometry.
    // Tolerance: 1e-12 for beams; the mean in-plane angle of a narrow bundle within 1 % of its
    // tilt.
    const auto down = IonDistribution::beam(50, Vec3(0, 0, -1));
    const auto leaning = down.tilted(30, 60).sample({0, 0, 0, 0}).direction;
    CHECK(leaning.x == Approx(0.5 * std::cos(60 * degree)).epsilon(1e-12));
    CHECK(leaning.y == Approx(0.5 * std::sin(60 * degree)).epsilon(1e-12));
    CHECK(leaning.z == Approx(-std::cos(30 * degree)).epsilon(1e-12));
    const auto tilted = falling(0.1).tilted(2, 0);
    CHECK(tilted.mean_rad() / degree == Approx(-2).epsilon(0.01));
    CHECK(falling(0.1).tilted(2, 180).mean_rad() / degree == Approx(2).epsilon(0.01));
    CHECK(std::fabs(falling(0.1).tilted(2, 90).mean_rad()) < 1e-9);
    CHECK(tilted.spread_rad() == Approx(falling(0.1).spread_rad()).epsilon(0.01));
    CHECK(tilted.median_angle_deg() > 1.9);
    CHECK(tilted.mean_energy_ev() == Approx(falling(0.1).mean_energy_ev()).epsilon(1e-12));
    CHECK(falling(0.1).tilted(0, 50).spread_rad() == falling(0.1).spread_rad());
    std::vector<double> a, b, c;
    tilted.append_content(a);
    falling(0.1).tilted(2, 0).append_content(b);
    falling(0.1).tilted(2, 1).append_content(c);
    CHECK(a == b);
    CHECK(a != c);
}

TEST_CASE("beams stay beams inside a mixture", "[ions][laws]") {
    // Oracle: steps of the beams' shares at their own angles, Gaussian slopes elsewhere; the same
    //         after a tilt.
    // Source: the definition of a mixture. Tolerance: 1e-4.
    const auto upright = IonDistribution::beam(100, Vec3(0, 0, -1));
    const auto leaning = IonDistribution::beam(70, Vec3(0.1, 0, -1));
    const double sigma = 0.05;
    const auto mixed = IonDistribution::mixture(
        {1, 1, 2}, {upright, leaning, IonDistribution::gaussian(50, sigma)});
    const InPlane& plane = mixed.in_plane();
    for (double phi : {-0.2, -0.0998, -0.0995, -0.01, -1e-6, 1e-6, 0.01, 0.2}) {
        const double expected = 0.25 * (phi > -std::atan(0.1)) + 0.25 * (phi > 0) +
                                0.25 * std::erfc(-std::tan(phi) / sigma / std::sqrt(2.0));
        CAPTURE(phi);
        CHECK(std::fabs(plane.share_below(phi) - expected) < 1e-4);
    }
    CHECK(plane.moment.back() == Approx(-0.025).epsilon(1e-6));
    CHECK(mixed.mean_energy_ev() == Approx(67.5).epsilon(1e-12));
    const IonDistribution turned = mixed.tilted(3, 0);
    const InPlane& tilted = turned.in_plane();
    CHECK(tilted.share_below(-3 * degree + 1e-5) - tilted.share_below(-3 * degree - 1e-5) ==
          Approx(0.25).margin(1e-3));
}

TEST_CASE("bundles of different width are all known", "[ions][laws]") {
    // Oracle: each part of a mixture reports its own spread.
    // Source: the definition of a mixture.
    // Tolerance: 1 %.
    const auto narrow = IonDistribution::gaussian(1000, 0.005);
    const auto wide = IonDistribution::gaussian(15, 0.1);
    const auto spreads = IonDistribution::mixture({1, 9}, {narrow, wide}).spreads();
    REQUIRE(spreads.size() == 2);
    CHECK(spreads[0].spread == Approx(0.005).epsilon(0.01));
    CHECK(spreads[1].spread == Approx(std::atan(0.1)).epsilon(0.02));
    CHECK(narrow.spreads().size() == 1);
}

TEST_CASE("the new laws refuse what cannot be", "[ions][laws]") {
    const auto beam = IonDistribution::beam(100, Vec3(0, 0, -1));
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({1, 1}, {1}, 0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({-1, 1}, {1}, 0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({0, 1}, {1, 1}, 0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({0, 1}, {0}, 0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({0, 1}, {-1}, 0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::falling_spectrum({0, 1}, {1}, -0.1), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::mixture({}, {}), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::mixture({1, 2}, {beam}), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::mixture({0}, {beam}), std::invalid_argument);
    CHECK_THROWS_AS(IonDistribution::mixture({-1, 2}, {beam, beam}), std::invalid_argument);
    CHECK_THROWS_AS(beam.tilted(46, 0), std::invalid_argument);
    CHECK_THROWS_AS(beam.tilted(-1, 0), std::invalid_argument);
}
