// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/davis_vanderslice.hpp"
#include "tests/support/sheath_cases.hpp"
#include "tests/support/statistics.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <array>
#include <cmath>
#include <cstring>
#include <stdexcept>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

using Kind = CollisionProcess::Kind;

/// 1000 V over 1 mm; ions enter at next to no energy, so that the drop is all they have.
Sheath steady_sheath(double power) {
    Sheath sheath;
    sheath.electron_temperature_ev = 1e-6;
    sheath.voltage = Waveform::steady(1000);
    sheath.thickness_nm = 1e6;
    sheath.profile_power = power;
    return sheath;
}

/// A cold gas of constant mean free path in which ions only exchange their charge.
SheathIon exchanging_ion(double free_paths) {
    SheathIon ion = argon_ion(0, 0);
    ion.collisions = {constant_process(Kind::charge_exchange, "Ar", 39.948, free_paths, 1e-6)};
    return ion;
}

/// Pulls of `bins` equally likely energy bins and of the uncollided against the law, standard
/// errors from the spread over independent seeds: scrambled points do better than binomial ones.
rille::tests::Pulls law_pulls(const DavisVanderslice& law, double free_paths, int bins) {
    const int seeds = 48, ions = law.free_paths > 2 ? 5120 : 1024;
    std::vector<std::vector<double>> share(bins, std::vector<double>(seeds, 0.0));
    for (int seed = 0; seed < seeds; ++seed)
        for (const auto& a : follow_ions(steady_sheath(law.power), exchanging_ion(free_paths),
                                         {ions, std::uint64_t(100 + seed)})
                                 .ions) {
            const double below = law.below(std::min(a.energy_ev / 1000, 1.0));
            const int bin = int(bins * below / (1 - law.uncollided()));
            share[std::min(bin, bins - 1)][seed] += 1.0 / ions;
        }
    std::vector<double> pulls;
    for (int b = 0; b < bins; ++b) {
        const Mean mean(share[b]);
        const double expected =
            (1 - law.uncollided()) / bins + (b == bins - 1 ? law.uncollided() : 0.0);
        pulls.push_back((mean.value - expected) / mean.error);
    }
    return rille::tests::Pulls(pulls);
}

} // namespace

TEST_CASE("charge exchange in a steady sheath: the closed forms", "[sheath]") {
    // Oracle: uncollided share, mean, distribution and density for four thicknesses in mean free
    // paths; the density with the uncollided is normalised. Source: Davis & Vanderslice, Phys.
    // Rev. 131 (1963) 219, from memory, derived here; values computed. Tolerance: 1e-6.
    struct Row {
        double a, uncollided, matrix, child, collisional;
    };
    const std::array<Row, 4> rows = {{{0.5, 0.606531, 0.852245, 0.814470, 0.835553},
                                      {1, 0.367879, 0.735759, 0.675121, 0.708712},
                                      {2, 0.135335, 0.567668, 0.486838, 0.531001},
                                      {5, 0.006738, 0.320539, 0.244530, 0.284797}}};
    for (const Row& row : rows) {
        const DavisVanderslice matrix{row.a, 2};
        CHECK(matrix.uncollided() == Approx(row.uncollided).margin(1e-6));
        CHECK(matrix.mean() == Approx(row.matrix).margin(1e-6));
        CHECK(DavisVanderslice{row.a, 4 / 3.}.mean() == Approx(row.child).margin(1e-6));
        CHECK(DavisVanderslice{row.a, 5 / 3.}.mean() == Approx(row.collisional).margin(1e-6));
        CHECK(2 / row.a - 2 * (1 - std::exp(-row.a)) / (row.a * row.a) ==
              Approx(matrix.mean()).margin(1e-6));
        double sum = matrix.uncollided(); // in z, 1 - share = z^2, the density is finite
        for (int i = 0; i < 4000; ++i) {
            const double z = (i + 0.5) / 4000;
            sum += matrix.density(1 - z * z) * 2 * z / 4000;
        }
        CHECK(sum == Approx(1).margin(1e-6));
    }
    const std::array<std::array<double, 2>, 5> below = {
        {{0.1, 0.097542}, {0.25, 0.235053}, {0.5, 0.443332}, {0.75, 0.632121}, {0.9, 0.745268}}};
    for (const auto& [share, value] : below)
        CHECK(DavisVanderslice{2, 2}.below(share) == Approx(value).margin(1e-6));
    CHECK(DavisVanderslice{1, 2}.density(0.5) == Approx(0.527574).margin(1e-6));
    CHECK(DavisVanderslice{2, 2}.density(0.5) == Approx(0.787247).margin(1e-6));
    CHECK(DavisVanderslice{5, 2}.density(0.5) == Approx(0.817420).margin(1e-6));
}

TEST_CASE("charge exchange in a steady sheath: trajectories", "[sheath]") {
    // Oracle: the closed forms above. Source: the same. Tolerance: pulls of 64 bins over 49,152
    // ions with standard errors from 48 seeds: chi^2 per bin within 1 +- 4 sqrt(2/64) and 0.1 for
    // errors that are estimates themselves, largest below 4.5, mean below 4/sqrt(64); a mean free
    // path 2 % off must fail.
    const std::array<std::array<double, 2>, 4> cases = {
        {{2, 0.5}, {2, 2}, {4 / 3., 2}, {5 / 3., 5}}};
    for (const auto& [power, a] : cases) {
        CAPTURE(power, a);
        const auto good = law_pulls({a, power}, a, 64);
        CAPTURE(good.chi2_per_bin, good.largest, good.mean);
        CHECK(std::fabs(good.chi2_per_bin - 1.05) < 0.1 + 4 * std::sqrt(2.0 / 64));
        CHECK(good.largest < 4.5);
        CHECK(std::fabs(good.mean) < 4 / std::sqrt(64.0));
        const auto fault = law_pulls({a, power}, 1.02 * a, 64);
        CAPTURE(fault.chi2_per_bin, fault.largest, fault.mean);
        CHECK((std::fabs(fault.chi2_per_bin - 1.05) > 0.1 + 4 * std::sqrt(2.0 / 64) ||
               fault.largest > 4.5));
    }
}

TEST_CASE("charge exchange: mean energy and number", "[sheath]") {
    // Oracle: mean energy by the closed form; as many exchanges as mean free paths, each leaving
    // one neutral; with many, energies fall off exponentially over the energy gained in a mean
    // free path at the wall. Source: Davis & Vanderslice 1963, from memory; derived here.
    // Tolerance: 4 standard errors from 16 seeds; exponential within 3 %.
    for (const double a : {1.0, 5.0, 50.0}) {
        std::vector<double> mean, number;
        for (std::uint64_t seed = 0; seed < 16; ++seed) {
            const Arrivals r = follow_ions(steady_sheath(2), exchanging_ion(a), {2048, seed});
            mean.push_back(energy_figures(r.ions).mean / 1000);
            number.push_back(r.exchanges_per_ion);
            CHECK(double(r.fast_neutrals.size()) == Approx(2048 * r.exchanges_per_ion));
        }
        const Mean m(mean), n(number);
        CAPTURE(a, m.value, m.error, n.value, n.error);
        CHECK(std::fabs(m.value - DavisVanderslice{a, 2}.mean()) < 4 * m.error);
        CHECK(std::fabs(n.value - a) < 4 * n.error);
        if (a < 50) continue;
        const double per_free_path = 2 * 1000 / a;
        CHECK(1000 * m.value == Approx(per_free_path).epsilon(0.03));
    }
}

TEST_CASE("energy of an ion and its fast neutrals", "[sheath]") {
    // Oracle: energy in = energy out, ion by ion, for a steady voltage and a cold gas, with elastic
    // collisions and their recoils on the way; with a warm gas once its own energy is counted in.
    // Source: conservation of energy. Tolerance: 1e-12; 1e-9 warm, where ions turn back.
    for (const double power : {4 / 3., 5 / 3., 2.0}) {
        Sheath sheath = steady_sheath(power);
        sheath.electron_temperature_ev = 3;
        SheathIon ion = exchanging_ion(4);
        ion.transverse_ev = 0.3;
        ion.collisions.push_back(constant_process(Kind::isotropic, "He", 4.0026, 2, 1e-6));
        ion.collisions.push_back(constant_process(Kind::isotropic, "Xe", 131.293, 1, 1e-6));
        const Arrivals cold = follow_ions(sheath, ion, {8192, 5});
        CHECK(cold.exchanges_per_ion > 1);
        CHECK(cold.energy_defect < 1e-12);
        ion.gas_temperature_k = 500;
        CHECK(follow_ions(sheath, ion, {8192, 5}).energy_defect < 1e-9);
    }
    // Over all ions, without elastic collisions, what arrives is what the field gave.
    Sheath sheath = steady_sheath(4 / 3.);
    const Arrivals r = follow_ions(sheath, exchanging_ion(3), {4096, 5});
    double sum = 0;
    for (const auto& a : r.ions)
        sum += a.energy_ev;
    for (const auto& a : r.fast_neutrals)
        sum += a.energy_ev;
    CHECK(sum == Approx(4096 * 1000.0).epsilon(1e-9));
}

TEST_CASE("several gases add up", "[sheath]") {
    // Oracle: two gases of half the density do what one does; twice as many of one kind of
    // collision where its cross section is double. Source: rates add. Tolerance: 4 standard errors
    // from 16 seeds.
    std::vector<double> difference, share;
    for (std::uint64_t seed = 0; seed < 16; ++seed) {
        SheathIon one = exchanging_ion(2), two = exchanging_ion(1);
        two.collisions.push_back(two.collisions.front());
        difference.push_back(
            energy_figures(follow_ions(steady_sheath(2), one, {1024, seed}).ions).mean -
            energy_figures(follow_ions(steady_sheath(2), two, {1024, seed + 99}).ions).mean);
        SheathIon mixed = exchanging_ion(2);
        mixed.collisions.push_back(constant_process(Kind::isotropic, "heavy", 1e9, 1, 1e-6));
        share.push_back(follow_ions(steady_sheath(2), mixed, {1024, seed}).exchanges_per_ion);
    }
    const Mean d(difference), s(share);
    CAPTURE(d.value, d.error, s.value, s.error);
    CHECK(std::fabs(d.value) < 4 * d.error);
    // Elastic detours off a heavy target lengthen the way, so exchanges may only grow in number.
    CHECK(s.value > 2 - 4 * s.error);
}

TEST_CASE("the same arrivals on any number of threads", "[sheath]") {
    // Oracle: the bits of every arrival. Source: fixed chunks. Tolerance: none; another seed must
    // differ.
    Sheath sheath = swinging_sheath(4 / 3., 0.9, 8, 39.948);
    SheathIon ion = argon_ion(0.1);
    ion.collisions = argon_in_argon(gas_density(200));
    const auto run = [&](int threads, std::uint64_t seed) {
        const tbb::global_control limit(tbb::global_control::max_allowed_parallelism,
                                        std::size_t(threads));
        return follow_ions(sheath, ion, {6000, seed});
    };
    const auto same = [](const std::vector<Arrival>& a, const std::vector<Arrival>& b) {
        return a.size() == b.size() &&
               std::equal(a.begin(), a.end(), b.begin(), [](auto& x, auto& y) {
                   return std::memcmp(&x.energy_ev, &y.energy_ev, sizeof x.energy_ev) == 0 &&
                          std::memcmp(&x.tangent, &y.tangent, sizeof x.tangent) == 0 &&
                          x.phase == y.phase;
               });
    };
    const Arrivals one = run(1, 4);
    CHECK(one.fast_neutrals.size() > 1000);
    for (const int threads : {2, 4}) {
        const Arrivals many = run(threads, 4);
        CHECK(same(one.ions, many.ions));
        CHECK(same(one.fast_neutrals, many.fast_neutrals));
    }
    CHECK_FALSE(same(one.ions, run(2, 5).ions));
}

TEST_CASE("charge exchange with another mass is refused", "[sheath]") {
    SheathIon ion = exchanging_ion(1);
    ion.collisions.front().gas_mass_amu = 36;
    CHECK_THROWS_AS(follow_ions(steady_sheath(2), ion, {8, 1}), std::invalid_argument);
    ion.collisions.front().kind = Kind::isotropic;
    CHECK_NOTHROW(follow_ions(steady_sheath(2), ion, {8, 1}));
    ion.collisions.front().cross_section_nm2.clear();
    CHECK_THROWS_AS(follow_ions(steady_sheath(2), ion, {8, 1}), std::invalid_argument);
}
