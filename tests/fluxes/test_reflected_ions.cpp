// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_reflection.hpp"
#include "fluxes/reflected_ions.hpp"
#include "fluxes/sampling.hpp"
#include "tests/support/one_ion.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <array>
#include <cmath>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Surface;
using tests::degree;
using tests::Mean;
using tests::OneIon;
using tests::pi;

namespace {

/// Loss-free mirror with a constant probability.
IonReflection mirror_law(double probability) {
    IonReflection law;
    law.critical_deg = 0;
    law.exponent = 0;
    law.probability = probability;
    law.collisions = 0;
    law.scatter_deg = 0;
    return law;
}

template <class Where>
Mean average(const ReflectedIons& r, const Surface& s, Where where) {
    return tests::batch_average(
        s, [&](int b, int e) { return tests::reflected_tally(r, b, 0, e); }, where);
}

} // namespace

TEST_CASE("energy kept in binary collisions", "[reflected]") {
    // Oracle: table of K(chi/N)^N for N = 1, 2, 3: argon and chlorine on silicon, argon on
    // tungsten. Source: kinematics of elastic two-body collisions, derived here. Tolerance: 6e-4
    // (three printed digits); a collision too many must fail.
    struct Row {
        double theta;
        std::array<double, 9> kept; ///< Ar-Si, Cl-Si, Ar-W for N = 1, 2, 3; 0 = too far for one
    };
    const std::array<Row, 5> rows = {
        {{60, {0, .407, .577, 0, .466, .618, .803, .890, .924}},
         {70, {.381, .693, .789, .470, .726, .812, .903, .949, .965}},
         {75, {.638, .818, .877, .682, .838, .890, .943, .971, .980}},
         {80, {.833, .916, .944, .852, .925, .950, .974, .987, .991}},
         {85, {.957, .979, .986, .962, .981, .987, .993, .997, .998}}}};
    const std::array<std::array<double, 2>, 3> pairs = {
        {{39.948, 28.0855}, {35.453, 28.0855}, {39.948, 183.84}}};
    for (const Row& row : rows)
        for (int p = 0; p < 3; ++p)
            for (int n = 1; n <= 3; ++n) {
                IonReflection law;
                law.target_mass_amu = pairs[p][1];
                law.collisions = n;
                const double c = std::cos(row.theta * degree), expected = row.kept[3 * p + n - 1];
                CAPTURE(row.theta, p, n);
                CHECK(std::fabs(energy_kept(law, pairs[p][0], c) - expected) < 6e-4);
                law.collisions = n + 1;
                if (row.theta <= 80)
                    CHECK(std::fabs(energy_kept(law, pairs[p][0], c) - expected) > 2e-3);
            }
}

TEST_CASE("reflection probability and direction", "[reflected]") {
    // Oracle: 0 below critical, ((theta - critical)/(90 - critical))^m above; specular without
    //         scatter; with scatter never into the surface and unbiased azimuth.
    // Source: the laws themselves.
    // Tolerance: 1e-12; mean sideways component within 4 standard errors of 0.
    IonReflection law;
    law.exponent = 2;
    CHECK(reflection_probability(law, std::cos(59.9 * degree)) == 0);
    CHECK(reflection_probability(law, std::cos(75 * degree)) == Approx(0.25));
    CHECK(reflection_probability(law, 0) == Approx(1));
    const Vec3 normal(0, 0, 1), down(std::sin(80 * degree), 0, -std::cos(80 * degree));
    law.scatter_deg = 0;
    CHECK((reflected_direction(law, down, normal, normal, {0.3, 0.6}, 1) - Vec3(down.x, 0, -down.z))
              .length() < 1e-12);
    law.scatter_deg = 10;
    const int count = 20000;
    double sideways = 0;
    const ScrambledPoints points(7);
    for (int i = 0; i < count; ++i) {
        const Vec3 d = reflected_direction(law, down, normal, normal, points.pair(i, 0), i);
        REQUIRE(d.z > 0);
        REQUIRE(std::fabs(d.length() - 1) < 1e-12);
        sideways += d.y;
    }
    CHECK(std::fabs(sideways / count) < 4 * 10 * degree / std::sqrt(count));
}

TEST_CASE("microtrench band under tilted walls", "[reflected]") {
    // Oracle: vertical beam, walls tilted by alpha, height H, specular with probability P: extra
    // floor
    //         flux P cos(2 alpha) from the foot out to W = H tan(alpha) / cos(2 alpha), none
    //         beyond.
    // Source: ray geometry, derived here.
    // Tolerance: 4 standard errors, those < 1 %; the band edge within one element.
    const double alpha = GENERATE(1.0, 2.0, 5.0), height = 500, floor = 200, p = 0.7;
    const double inset = height * std::tan(alpha * degree);
    Domain d;
    d.spacing = 1;
    d.cells_x = static_cast<int>(std::ceil(floor + 2 * inset)) + 40;
    const Surface s = tests::leaning_trench(d, floor, height, alpha * degree, 1.0);
    const OneIon one(d, s, IonDistribution::beam(100, Vec3(0, 0, -1)));
    ReflectionOptions options;
    options.ions_per_species = 16384;
    options.averaged = false; // the edge of the band is looked at
    const std::vector<int> material(s.size(), 0);
    // Only walls reflect: the floor is hit at normal incidence.
    IonReflection law = mirror_law(p);
    law.critical_deg = 60;
    const auto r = trace_reflected(d, s, one.caster, material, one.ions, {law}, options);
    CHECK(r.lost_share < 1e-5);
    const double width = height * std::tan(alpha * degree) / std::cos(2 * alpha * degree);
    const double expected = p * std::cos(2 * alpha * degree);
    const auto in_band = [&](const Vec3& c) {
        const double off = 0.5 * floor - std::fabs(c.x);
        return c.z < -height + 1e-6 && off < width - 1 && off > 0;
    };
    const Mean band = average(r, s, in_band);
    CAPTURE(alpha, band.value, band.error, expected);
    CHECK(band.error < 0.01 * expected);
    CHECK(std::fabs(band.value - expected) < 4 * band.error + 1e-3 * expected);
    CHECK(std::fabs(band.value - 1.03 * expected) > 4 * band.error + 1e-3 * expected);
    const Mean beyond = average(r, s, [&](const Vec3& c) {
        return c.z < -height + 1e-6 && 0.5 * floor - std::fabs(c.x) > width + 1;
    });
    CHECK(beyond.value < 1e-9);
    // Uniform: outer and inner half of the band agree.
    const Mean outer = average(r, s, [&](const Vec3& c) {
        return in_band(c) && 0.5 * floor - std::fabs(c.x) < 0.5 * width;
    });
    CHECK(std::fabs(outer.value - expected) < 4 * outer.error + 2e-3 * expected);
}

TEST_CASE("reflected ions: weight is kept", "[reflected]") {
    // Oracle: with reflection P at every hit the tally of one per ion is P w1 + P^2 w2 + ...; at P
    // = 1 on
    //         the walls and 0 on the floor every ion that starts on a wall ends on the floor or
    //         leaves; scatter and roulette change no mean: share reaching floor + escaped = share
    //         reflected.
    // Source: conservation.
    // Tolerance: 4 standard errors.
    Domain d;
    d.spacing = 2;
    d.cells_x = 40;
    const Surface s = tests::trench(d, 40, 200, 2.0);
    std::vector<int> material;
    for (const Vec3& n : s.normal)
        material.push_back(std::fabs(n.x) > 0.5 ? 1 : 0);
    IonReflection wall = mirror_law(1.0);
    wall.scatter_deg = 3;
    const OneIon one(d, s, IonDistribution::gaussian(100, 0.1));
    const auto trace = [&](double probability) {
        wall.probability = probability;
        return trace_reflected(d, s, one.caster, material, one.ions, {mirror_law(0), wall}, {});
    };
    const auto floor = [](const Vec3& c) { return c.z < -199.99; };
    const auto full = average(trace(1.0), s, floor);
    // Walls that reflect all: floor receives reflected = mouth (40) - direct - what scatters out.
    const double b = 1 / (std::sqrt(2.0) * 0.1 * 5);
    const double unreflected = std::erf(b) - (1 - std::exp(-b * b)) / (b * std::sqrt(pi));
    CAPTURE(full.value, full.error, unreflected);
    CHECK(full.value < 1 - unreflected + 4 * full.error);
    CHECK(full.value > 0.97 * (1 - unreflected));
    const auto half = average(trace(0.5), s, floor);
    CHECK(half.value < 0.5 * full.value + 4 * half.error);
    CHECK(half.value > 0.25 * full.value);
}

TEST_CASE("reflected ions: same bits for any number of threads", "[reflected]") {
    // Oracle: the result with one thread.
    // Source: fixed chunks summed in order.
    // Tolerance: none.
    Domain d;
    d.cells_x = 80;
    const Surface s = tests::trench(d, 40, 120, 1.0);
    const std::vector<int> material(s.size(), 0);
    const OneIon one_ion(d, s, IonDistribution::thermal_fall(100, 0.3, 0.3), 1,
                         {SquareRootLaw{0.1, 20}, FlatAngle{}, 1});
    const auto run = [&](int threads, std::uint64_t refresh) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        ReflectionOptions options;
        options.ions_per_species = 16384;
        options.refresh = refresh;
        const auto reflected = trace_reflected(d, s, one_ion.caster, material, one_ion.ions,
                                               {IonReflection{}}, options);
        std::vector<double> tallies;
        for (int b = 0; b < batches; ++b)
            for (std::size_t e = 0; e < s.size(); ++e)
                tallies.push_back(tests::reflected_tally(reflected, b, 0, int(e)));
        return tallies;
    };
    const auto one = run(1, 0);
    CHECK(run(2, 0) == one);
    CHECK(run(4, 0) == one);
    CHECK(run(1, 1) != one);
    double sum = 0;
    for (double v : one)
        sum += v;
    CHECK(sum > 0);
}

TEST_CASE("reflected ions of a floor do not act on a wall at its foot", "[reflected]") {
    // Oracle: ions that come down the normal of a floor leave nothing on a surface turned by a
    // right angle, whatever the side; a wall that turns towards where they come from gets no more.
    // Source: cosine of incidence, definition of the function.
    // Tolerance: 1e-12; falls without a jump.
    const double half = 0.5 * std::acos(-1.0);
    for (const double side : {-1.0, 1.0}) {
        CHECK(share_after_turn(0, 0, side * half) == Approx(0).margin(1e-12));
        CHECK(share_after_turn(0, 0, side * 0.1) == 1);
        CHECK(share_after_turn(side * half, side * 0.1, side * 0.5) == 1);
        CHECK(share_after_turn(side * half, side * 0.1, side * 2.5) < 1e-12);
        double before = 1;
        for (double angle = 0; angle < 2 * half; angle += 0.01) {
            const double share = share_after_turn(0.1, 0, side * angle);
            CHECK(share <= before + (side * angle < 0.1 ? 1 : 0));
            CHECK(std::fabs(share - before) < 0.02);
            before = share;
        }
    }
}

TEST_CASE("where reflected ions come from is found with them", "[reflected]") {
    // Oracle: what a wall sends on comes to the floor from above, to the other wall from above and
    // across: angles to the vertical within the spread of the beam and the scatter.
    // Source: geometry. Tolerance: 35 degrees, six times the spread; measured from the own normal
    // of a wall the same must fail.
    Domain d;
    d.cells_x = 60;
    const Surface s = tests::leaning_trench(d, 16, 60, 0.0, 1.0);
    const tests::OneIon one(d, s, IonDistribution::gaussian(100, 0.1));
    const auto r = trace_reflected(d, s, one.caster, std::vector<int>(s.size(), 0), one.ions,
                                   {IonReflection{}}, {8192, 1, 0});
    REQUIRE(r.from_angle.size() == s.size());
    int floors = 0, walls = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        double comes = 0;
        for (int b = 0; b < batches; ++b)
            comes += tests::reflected_tally(r, b, 0, int(e));
        if (s.centre[e].z > -30 || !(comes > 0)) continue;
        (s.normal[e].z > 0.9 ? floors : walls) += 1;
        CHECK(std::fabs(r.from_angle[e]) < 35 * tests::degree);
        if (s.normal[e].z < 0.9)
            CHECK(std::fabs(r.from_angle[e] - std::atan2(s.normal[e].x, s.normal[e].z)) >
                  35 * tests::degree);
    }
    CHECK(floors > 10);
    CHECK(walls > 3);
}
