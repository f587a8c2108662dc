// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"
#include "fluxes/sampling.hpp"
#include "tests/support/csv_table.hpp"
#include "tests/support/one_ion.hpp"
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

namespace {

Domain square(double width) {
    Domain d;
    d.symmetry = geometry::Symmetry::full;
    d.spacing = width / 60;
    d.cells_x = d.cells_y = 60;
    return d;
}

/// Round hole of radius 10 and the given depth: rings on the wall and on the floor.
Surface hole(const Domain& d, double depth, int around) {
    std::vector<std::array<double, 2>> profile = {{10, 0}};
    for (int i = 1; i <= 8; ++i)
        profile.push_back({10, -depth * i / 8});
    for (double r : {9.0, 7.5, 5.0, 2.5})
        profile.push_back({r, -depth});
    profile.push_back({0, -depth});
    return tests::revolved_hole(d, profile, around);
}

/// Average of tally 0 over elements, by batch.
template <class Where>
tests::Mean average(const tests::TabulatedIons& ions, const Surface& s, Where where) {
    return tests::batch_average(
        s, [&](int b, int e) { return ions.tally_batch(b, 0, e); }, where);
}

} // namespace

TEST_CASE("direct ions, full: floor of a round hole", "[direct][full]") {
    // Oracle: average over the floor, cosine law and Gaussian ions.
    // Source: closed forms (view factor of coaxial disks; Bessel functions), computed tables.
    // Tolerance: 4 standard errors, those < 0.5 %, plus 0.3 % for a bore of 48 flat sides; a fault
    // of
    //            3 % must fail.
    const Domain d = square(30);
    const auto check = [&](const IonDistribution& law, double aspect, double expected,
                           int directions) {
        const double depth = 20 * aspect;
        const Surface s = hole(d, depth, 48);
        DirectIons::Options options;
        options.directions = directions;
        const OneIon one(d, s, law, 1, per_ion, options);
        const tests::Mean floor =
            average(one.ions, s, [&](const Vec3& c) { return c.z < -depth + 1e-6; });
        CAPTURE(aspect, floor.value, floor.error, expected);
        CHECK(floor.error < 0.005 * expected);
        CHECK(std::fabs(floor.value - expected) < 4 * floor.error + 0.003 * expected);
        CHECK(std::fabs(floor.value - 1.03 * expected) > 4 * floor.error + 0.003 * expected);
    };
    check(IonDistribution::thermal_fall(0, 1, 1), 1, 0.1715729, 1024);
    for (auto& row : tests::csv_table("direct_flux_gaussian.csv"))
        if ((row["AR"] == 10 || row["AR"] == 20) &&
            (row["sigma_deg"] == 1 || row["sigma_deg"] == 2))
            check(IonDistribution::gaussian(100, row["sigma_deg"] * degree), row["AR"],
                  row["cyl_avg"], 1024);
}

TEST_CASE("direct ions, full: open plane, turned normals and batches", "[direct][full]") {
    // Oracle: flux 1 through an open flat surface; cos(angle) under a vertical beam at a turned
    // normal;
    //         mean of the batches = tally.
    // Source: definition.
    // Tolerance: 1e-12 for the beam at table angles (float 1e-6), 1e-12 for batches.
    const Domain d = square(30);
    const Surface s = tests::revolved_hole(d, {{10, 0}, {0, 0}}, 24);
    const OneIon vertical(d, s, IonDistribution::beam(100, Vec3(0, 0, -1)), 2.5);
    const tests::TabulatedIons& beam = vertical.ions;
    const auto angles = beam.rate_angles();
    CHECK(angles.size() <= 64);
    CHECK(angles.front() == 0);
    CHECK(angles.back() == pi);
    for (std::size_t e = 0; e < s.size(); ++e) {
        CHECK(beam.flux(0, int(e)) == Approx(2.5).epsilon(1e-12));
        CHECK(beam.tally(0, int(e)) == Approx(2.5).epsilon(1e-9));
        for (double a : angles)
            CHECK(std::fabs(beam.tally_at(0, int(e), a) - 2.5 * std::max(0.0, std::cos(a))) < 1e-5);
    }
    const OneIon gaussian(d, s, IonDistribution::gaussian(100, 0.1));
    const tests::TabulatedIons& spread = gaussian.ions;
    double mean = 0;
    for (int b = 0; b < 8; ++b)
        mean += spread.tally_batch(b, 0, 5) / 8;
    CHECK(mean == Approx(spread.tally(0, 5)).epsilon(1e-12));
    CHECK(spread.tally(0, 5) == Approx(1).epsilon(0.01));
}

TEST_CASE("direct ions, full: leaning ions and mixtures", "[direct][full]") {
    // Oracle: flat open surface, normal turned to psi towards +x: sum over ions of (r.n)/r_z over
    //         200,000 samples of the distribution.
    // Source: definition.
    // Tolerance: 0.5 % of the floor's flux (4096 directions); the upright ions must fail.
    const Domain d = square(12);
    const Surface s = tests::revolved_hole(d, {{4, 0}, {0, 0}}, 12);
    const geometry::RayCaster caster(d, s, 5);
    DirectIons::Options options;
    options.directions = 4096;
    const auto spectrum = IonDistribution::falling_spectrum({40, 100, 400}, {1, 2}, 0.5);
    const auto wide = IonDistribution::thermal_fall(15, 0.3, 0.3);
    const auto worst = [&](const IonDistribution& shot, const IonDistribution& expected) {
        const tests::TabulatedIons direct(d, s, caster, {{"X+", 40, 1, shot}}, {{0, per_ion}},
                                          options);
        double off = 0;
        for (double psi : {0.0, 45.0, 80.0, 88.0, 92.0, 97.0}) {
            double sum = 0;
            const int count = 200000;
            for (int i = 0; i < count; ++i) {
                const auto u = [&](int k) { return unit_interval(stream_key(5, i, k)); };
                const Vec3 r = -expected.sample({u(0), u(1), u(2), u(3)}).direction;
                const double facing =
                    r.x * std::sin(psi * pi / 180) + r.z * std::cos(psi * pi / 180);
                sum += std::max(0.0, facing) / r.z / count;
            }
            off = std::max(off, std::fabs(direct.tally_at(0, 3, psi * pi / 180) - sum));
        }
        return off;
    };
    const auto mixed = IonDistribution::mixture({1, 2}, {spectrum, wide});
    CHECK(worst(spectrum.tilted(5, 180), spectrum.tilted(5, 180)) < 0.005);
    CHECK(worst(mixed.tilted(5, 180), mixed.tilted(5, 180)) < 0.005);
    CHECK(worst(spectrum, spectrum.tilted(5, 180)) > 0.02);
}

TEST_CASE("direct ions, full: same bits for any number of threads", "[direct][full]") {
    // Oracle: one thread.  Source: disjoint outputs.  Tolerance: none.
    const Domain d = square(30);
    const Surface s = hole(d, 40, 24);
    const auto run = [&](int threads, std::uint64_t refresh) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        DirectIons::Options options;
        options.directions = 32;
        options.refresh = refresh;
        const OneIon one(d, s, IonDistribution::thermal_fall(100, 0.3, 0.3), 1, per_ion, options);
        const tests::TabulatedIons& ions = one.ions;
        std::vector<double> all;
        for (std::size_t e = 0; e < s.size(); ++e) {
            all.push_back(ions.flux(0, int(e)));
            all.push_back(ions.tally(0, int(e)));
            all.push_back(ions.tally_at(0, int(e), 1.3));
        }
        return all;
    };
    const auto one = run(1, 0);
    CHECK(run(2, 0) == one);
    CHECK(run(4, 0) == one);
    CHECK(run(1, 1) != one);
}
