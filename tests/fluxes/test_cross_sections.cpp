// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"

#include <catch2/catch.hpp>

#include <array>
#include <cmath>
#include <limits>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

using Kind = CollisionProcess::Kind;

/// Largest relative distance of the isotropic part from the digits that come with the tables of the
/// LXCat site, at twice their energies in the frame of the centre of mass.
double distance_from_digits(const PhelpsArgon& law) {
    const std::array<std::array<double, 2>, 4> digits = {
        {{3.1, 1.52468e-19}, {16, 3.48229e-20}, {62, 6.89166e-21}, {160, 2.06945e-21}}};
    double worst = 0;
    for (const auto& [energy, area] : digits)
        worst = std::max(worst, std::fabs(law.isotropic_nm2(2 * energy) / (area * 1e18) - 1));
    return worst;
}

} // namespace

TEST_CASE("argon in argon: the closed forms", "[sheath]") {
    // Oracle: momentum transfer, isotropic and backward part at 0.1 to 1000 eV for both exponents.
    // Source: Phelps, J. Appl. Phys. 76 (1994) 747; values computed. Tolerance: 1e-5.
    struct Row {
        double energy, momentum, isotropic, isotropic_2, backward, backward_2;
    };
    const std::array<Row, 7> rows = {
        {{0.1, 1.57441e-18, 6.02780e-19, 6.03055e-19, 4.85813e-19, 4.85675e-19},
         {1, 1.16032e-18, 2.54797e-19, 2.68750e-19, 4.52761e-19, 4.45785e-19},
         {10, 9.14299e-19, 1.08653e-19, 1.65513e-19, 4.02823e-19, 3.74393e-19},
         {30, 8.18683e-19, 3.74055e-20, 7.55581e-20, 3.90639e-19, 3.71563e-19},
         {100, 7.25666e-19, 9.00799e-21, 2.56481e-20, 3.58329e-19, 3.50009e-19},
         {300, 6.50128e-19, 2.24791e-21, 8.86103e-21, 3.23940e-19, 3.20633e-19},
         {1000, 5.76371e-19, 4.75680e-22, 2.69019e-21, 2.87947e-19, 2.86840e-19}}};
    const PhelpsArgon table, paper{2.0};
    for (const Row& row : rows) {
        INFO(row.energy << " eV");
        CHECK(table.momentum_nm2(row.energy) == Approx(row.momentum * 1e18).epsilon(1e-5));
        CHECK(table.isotropic_nm2(row.energy) == Approx(row.isotropic * 1e18).epsilon(1e-5));
        CHECK(paper.isotropic_nm2(row.energy) == Approx(row.isotropic_2 * 1e18).epsilon(1e-5));
        CHECK(table.backward_nm2(row.energy) == Approx(row.backward * 1e18).epsilon(1e-5));
        CHECK(paper.backward_nm2(row.energy) == Approx(row.backward_2 * 1e18).epsilon(1e-5));
    }
    CHECK(table.momentum_nm2(0.01) == table.momentum_nm2(0.1));
}

TEST_CASE("argon in argon: digits of the published table", "[sheath]") {
    // Oracle: isotropic cross section at four energies. Source: LXCat, Phelps data, 2016 table.
    // Tolerance: 1e-5; the exponent 2.0 must fail.
    CHECK(distance_from_digits({2.3}) < 1e-5);
    CHECK(distance_from_digits({2.0}) > 0.1);
}

TEST_CASE("argon in argon as processes", "[sheath]") {
    // Oracle: the closed forms between the nodes of the tables; mean free path of charge exchange
    // at 10 mTorr and 300 K, 100 and 10 eV. Source: Phelps 1994; computed. Tolerance: 1e-3.
    const double density = 3.2188e20 * 1e-27;
    const auto processes = argon_in_argon(density);
    REQUIRE(processes.size() == 2);
    CHECK(processes[0].kind == Kind::charge_exchange);
    CHECK(processes[1].kind == Kind::isotropic);
    CHECK(processes[0].energy_ev.front() == Approx(0.1));
    CHECK(processes[0].energy_ev.back() == Approx(1e4));
    const PhelpsArgon law;
    for (double e = 0.1; e < 9e3; e *= 1.17) {
        CHECK(cross_section_nm2(processes[0], e) == Approx(law.backward_nm2(e)).epsilon(1e-3));
        CHECK(cross_section_nm2(processes[1], e) == Approx(law.isotropic_nm2(e)).epsilon(1e-3));
    }
    CHECK(1 / (density * cross_section_nm2(processes[0], 100)) == Approx(8.670e6).epsilon(1e-3));
    CHECK(1 / (density * cross_section_nm2(processes[0], 10)) == Approx(7.712e6).epsilon(1e-3));
}

TEST_CASE("capture by a polarised neutral", "[sheath]") {
    // Oracle: cross section of an ion of 1 eV on a neutral of its own mass. Source: Langevin's
    // law and polarisabilities from memory, values computed. Tolerance: 0.2 % (printed digits);
    // falls as one over the square root of the energy.
    CHECK(capture_nm2(1, 39.948, 39.948, 1.64e-3) == Approx(0.305).epsilon(2e-3));
    CHECK(capture_nm2(1, 31.998, 31.998, 1.58e-3) == Approx(0.300).epsilon(2e-3));
    CHECK(capture_nm2(1, 70.906, 70.906, 4.61e-3) == Approx(0.512).epsilon(2e-3));
    CHECK(capture_nm2(4, 40, 40, 1.64e-3) == Approx(0.5 * capture_nm2(1, 40, 40, 1.64e-3)));
    const CollisionProcess capture = capture_process(Kind::isotropic, 40, "Ar", 40, 1, 1.64e-3);
    for (const double e : {0.13, 7.7, 940.0})
        CHECK(cross_section_nm2(capture, e) ==
              Approx(capture_nm2(e, 40, 40, 1.64e-3)).epsilon(1e-9));
    CHECK_THROWS_AS(capture_nm2(0, 40, 40, 1.64e-3), std::invalid_argument);
}

TEST_CASE("tabulated cross sections between and beyond their energies", "[sheath]") {
    // Oracle: straight lines in the logarithms, constant beyond the ends. Source: the contract of
    // CollisionProcess. Tolerance: 1e-12.
    const CollisionProcess power{Kind::isotropic, "X", 40, 1, {1, 100}, {4, 0.4}};
    CHECK(cross_section_nm2(power, 10) == Approx(4 / std::sqrt(10.0)).epsilon(1e-12));
    CHECK(cross_section_nm2(power, 0.5) == 4);
    CHECK(cross_section_nm2(power, 1000) == 0.4);
    const CollisionProcess onset{Kind::isotropic, "X", 40, 1, {10, 20}, {0, 1}};
    CHECK(cross_section_nm2(onset, std::sqrt(200.0)) == Approx(0.5).epsilon(1e-12));
    CHECK(cross_section_nm2(onset, 1) == 0);
    const CollisionProcess same = constant_process(Kind::isotropic, "X", 40, 1, 0.3);
    CHECK(cross_section_nm2(same, 1e-3) == 0.3);
    CHECK(cross_section_nm2(same, 1e5) == 0.3);
}

TEST_CASE("cross sections that cannot be are refused", "[sheath]") {
    const CollisionProcess good{Kind::isotropic, "X", 40, 1, {1, 100}, {4, 0.4}};
    CHECK_NOTHROW(check_process(good));
    const auto refused = [&](auto&& spoil) {
        CollisionProcess bad = good;
        spoil(bad);
        CHECK_THROWS_AS(check_process(bad), std::invalid_argument);
    };
    refused([](CollisionProcess& p) { p.energy_ev = {100, 1}; });
    refused([](CollisionProcess& p) { p.energy_ev = {1, 1}; });
    refused([](CollisionProcess& p) { p.energy_ev = {0, 1}; });
    refused([](CollisionProcess& p) { p.energy_ev = {1}; });
    refused([](CollisionProcess& p) { p.energy_ev.clear(), p.cross_section_nm2.clear(); });
    refused([](CollisionProcess& p) { p.cross_section_nm2[1] = -1; });
    refused([](CollisionProcess& p) {
        p.cross_section_nm2[0] = std::numeric_limits<double>::quiet_NaN();
    });
    refused([](CollisionProcess& p) { p.gas_density = -1; });
    refused([](CollisionProcess& p) { p.gas_mass_amu = 0; });
}
