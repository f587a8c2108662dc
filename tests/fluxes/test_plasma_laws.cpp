// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plasma_laws.hpp"

#include <catch2/catch.hpp>

#include <array>
#include <cmath>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

constexpr double te = 3;
const double edge = std::exp(-0.5) * 1e17 * 1e-27; ///< nm^-3, bulk 1e17 m^-3

} // namespace

TEST_CASE("speeds, fluxes and floating drop of eleven ions", "[plasma]") {
    // Oracle: Bohm speed [m/s], flux [m^-2 s^-1], drop over Te and in V for Te = 3 eV and 1e17
    // m^-3. Source: kinetic theory; Bohm (1949); flux balance; values derived here. Tolerance: 1e-4
    // relative (printed digits); a mass 1 % off must fail.
    struct Row {
        double mass, bohm, flux, ratio, drop;
    };
    const std::array<Row, 11> rows = {{{1.00728, 16951.8, 1.0282e21, 2.8388, 8.5163},
                                       {15.999, 4253.5, 2.5799e20, 4.2214, 12.6642},
                                       {31.998, 3007.7, 1.8242e20, 4.5680, 13.7040},
                                       {35.453, 2857.4, 1.7331e20, 4.6193, 13.8578},
                                       {39.948, 2691.8, 1.6327e20, 4.6789, 14.0368},
                                       {50.008, 2405.9, 1.4592e20, 4.7912, 14.3737},
                                       {69.006, 2048.1, 1.2422e20, 4.9522, 14.8567},
                                       {70.906, 2020.5, 1.2255e20, 4.9658, 14.8975},
                                       {80.912, 1891.4, 1.1472e20, 5.0318, 15.0955},
                                       {127.052, 1509.4, 9.1549e19, 5.2574, 15.7723},
                                       {131.293, 1484.8, 9.0058e19, 5.2739, 15.8216}}};
    for (const Row& row : rows) {
        const double speed = bohm_speed(te, row.mass);
        CHECK(speed * 1e-9 == Approx(row.bohm).epsilon(1e-4));
        CHECK(edge * speed * 1e18 == Approx(row.flux).epsilon(1e-4));
        const double drop = floating_drop_v(te, edge, edge * speed);
        CHECK(drop / te == Approx(row.ratio).epsilon(1e-4));
        CHECK(drop == Approx(row.drop).epsilon(1e-4));
        CHECK(drop == Approx(te * std::log(std::sqrt(row.mass / (2 * M_PI * electron_mass_amu))))
                          .epsilon(1e-12));
        CHECK(bohm_speed(te, 1.01 * row.mass) * 1e-9 != Approx(row.bohm).epsilon(1e-4));
    }
    CHECK(collisionless_edge_ratio() == Approx(0.60653).epsilon(1e-5));
    CHECK(plane_edge_ratio(0.10e9, 8.67e6) == Approx(0.29045).epsilon(1e-4));
    CHECK(electronegative_factor(1, 30) == Approx(0.25400).epsilon(1e-4));
}

TEST_CASE("neutrals and electrons", "[plasma]") {
    // Oracle: mean speeds at 300 K [m/s], one-way fluxes of a pure gas at 10 mTorr, electron speed.
    // Source: kinetic theory, values derived here. Tolerance: 1e-4 (printed digits).
    const double pascal = 1.3332237;
    CHECK(gas_density(pascal, 300) * 1e27 == Approx(3.2188e20).epsilon(1e-4));
    const std::array<std::array<double, 2>, 7> rows = {{{39.948, 398.75},
                                                        {18.998, 578.22},
                                                        {15.999, 630.09},
                                                        {35.453, 423.27},
                                                        {70.906, 299.30},
                                                        {50.008, 356.39},
                                                        {146.055, 208.54}}};
    for (const auto& row : rows)
        CHECK(thermal_speed(300 * ev_per_kelvin, row[0]) * 1e-9 == Approx(row[1]).epsilon(1e-4));
    CHECK(gas_flux(pascal, 300, 39.948) * 1e18 == Approx(3.2088e22).epsilon(1e-4));
    CHECK(gas_flux(pascal, 300, 70.906) * 1e18 == Approx(2.4085e22).epsilon(1e-4));
    CHECK(gas_flux(pascal, 400, 70.906) * 1e18 != Approx(2.4085e22).epsilon(1e-2));
    CHECK(thermal_speed(te, electron_mass_amu) * 1e-9 == Approx(1.15915e6).epsilon(1e-5));
    const std::array<std::array<double, 2>, 4> debye = {
        {{1e15, 4.0717e-4}, {1e16, 1.28760e-4}, {1e17, 4.07174e-5}, {1e18, 1.28760e-5}}};
    for (const auto& row : debye)
        CHECK(debye_length_nm(te, row[0] * 1e-27) * 1e-9 == Approx(row[1]).epsilon(2e-5));
    CHECK(debye_length_nm(te, edge) * 1e-9 == Approx(5.22821e-5).epsilon(1e-5));
}

TEST_CASE("sheath thickness: matrix, Child, collisional", "[plasma][thickness]") {
    // Oracle: thickness [m], speed [m/s], field [V/m] of argon at four voltages; the gap carries
    //         exactly the Bohm flux; both thicknesses cross at lambda = 0.3016 of Child's.
    // Source: Child (1911), Langmuir (1913); collisional law from memory, re-derived here; values
    //         derived here.
    // Tolerance: 1e-4 (printed digits); the flux closure 1e-10.
    struct Row {
        double volt, matrix, child, coarse, fine, speed, transit, field;
    };
    const std::array<Row, 4> rows = {
        {{20, 1.9091e-4, 1.7197e-4, 3.8717e-4, 2.4429e-4, 9829.09, 5.2488e-8, 1.5507e5},
         {100, 4.2688e-4, 5.7501e-4, 1.0169e-3, 6.4163e-4, 21978.5, 7.8488e-8, 2.3188e5},
         {300, 7.3938e-4, 1.3107e-3, 1.9659e-3, 1.2404e-3, 38067.9, 1.0330e-7, 3.0517e5},
         {1000, 1.3499e-3, 3.2335e-3, 4.0484e-3, 2.5544e-3, 69502.1, 1.3957e-7, 4.1234e5}}};
    for (const Row& row : rows) {
        CHECK(matrix_thickness_nm(row.volt, te, edge) * 1e-9 == Approx(row.matrix).epsilon(1e-4));
        const double child = child_thickness_nm(row.volt, te, edge);
        CHECK(child * 1e-9 == Approx(row.child).epsilon(1e-4));
        CHECK(collisional_thickness_nm(row.volt, te, edge, 3e6) * 1e-9 ==
              Approx(row.coarse).epsilon(1e-4));
        CHECK(collisional_thickness_nm(row.volt, te, edge, 0.3e6) * 1e-9 ==
              Approx(row.fine).epsilon(1e-4));
        const double speed = speed_of(row.volt, 39.948);
        CHECK(speed * 1e-9 == Approx(row.speed).epsilon(1e-5));
        CHECK(3 * child / speed == Approx(row.transit).epsilon(1e-4));
        CHECK(child_wall_field(row.volt, te, edge) * 1e9 == Approx(row.field).epsilon(1e-4));
        for (double mass : {1.00728, 39.948, 127.052}) {
            const double bohm = edge * bohm_speed(te, mass);
            CHECK(child_flux(row.volt, child, mass) == Approx(bohm).epsilon(1e-10));
            CHECK(child_flux(row.volt, 1.001 * child, mass) != Approx(bohm).epsilon(1e-4));
        }
        CHECK(collisional_thickness_nm(row.volt, te, edge, 0.3016 * child) ==
              Approx(child).epsilon(1e-4));
    }
}

TEST_CASE("sheath with its electrons: field at the wall and thickness", "[plasma][thickness]") {
    // Oracle: lD E / Te at the wall, exact and by Child's law, and the thickness over lD counted
    //         from a drop of Te / 2 and of Te.
    // Source: first integral of the planar sheath equation (standard, confirmed in an encyclopedia
    //         text); numbers derived here.
    // Tolerance: 1e-5 field; 1e-4 thickness (printed digits).
    struct Row {
        double u, field, child, ratio, from_half, from_one, child_s, matrix_s;
    };
    const std::array<Row, 5> rows = {
        {{10, 2.272717, 2.990698, 1.31591, 8.1151, 6.5056, 4.4583, 4.4721},
         {30, 3.408885, 3.935979, 1.15462, 15.0332, 13.4237, 10.1627, 7.7460},
         {100, 4.935068, 5.318296, 1.07765, 31.5156, 29.9061, 25.0707, 14.1421},
         {300, 6.710485, 6.999271, 1.04304, 65.3971, 63.7876, 57.1488, 24.4949},
         {1000, 9.244732, 9.457416, 1.02301, 151.786, 150.177, 140.983, 44.7214}}};
    const double debye = debye_length_nm(te, edge);
    for (const Row& row : rows) {
        const double volt = te * row.u, unit = debye / te;
        CHECK(exact_wall_field(volt, te, edge) * unit == Approx(row.field).epsilon(1e-5));
        CHECK(child_wall_field(volt, te, edge) * unit == Approx(row.child).epsilon(1e-5));
        CHECK(child_wall_field(volt, te, edge) / exact_wall_field(volt, te, edge) ==
              Approx(row.ratio).epsilon(1e-5));
        CHECK(exact_thickness_nm(volt, te, edge, 0.5 * te) / debye ==
              Approx(row.from_half).epsilon(1e-4));
        CHECK(exact_thickness_nm(volt, te, edge, te) / debye == Approx(row.from_one).epsilon(1e-4));
        CHECK(child_thickness_nm(volt, te, edge) / debye == Approx(row.child_s).epsilon(1e-4));
        CHECK(matrix_thickness_nm(volt, te, edge) / debye == Approx(row.matrix_s).epsilon(1e-4));
        CHECK(exact_wall_field(1.02 * volt, te, edge) * unit != Approx(row.field).epsilon(1e-3));
    }
    CHECK(exact_wall_field(1e-4 * te, te, edge) * debye / te ==
          Approx(std::sqrt(2e-12 / 3)).epsilon(1e-3)); // its limit for weak sheaths
}

TEST_CASE("facts of the trade about sheaths", "[plasma]") {
    // Oracle: no net free charge across sheath plus wall; a floating sheath is several Debye
    // lengths
    //         thick; the random flux of the electrons far exceeds the ions'.
    // Source: common practice, no source.
    // Tolerance: charge 1e-4 of either part; 3 to 30 Debye lengths; a factor of 50.
    const double bohm = bohm_speed(te, 39.948), flux = edge * bohm;
    const double debye = debye_length_nm(te, edge);
    const double drop = floating_drop_v(te, edge, flux);
    const double thickness = exact_thickness_nm(drop, te, edge, 0.5 * te) / debye;
    CHECK(thickness > 3);
    CHECK(thickness < 30);
    CHECK(0.25 * edge * thermal_speed(te, electron_mass_amu) > 50 * flux);
    // Charge between the place with drop 1e-3 Te and the wall, stepped in the drop: the density of
    // ions by conserved flux, of electrons by Boltzmann, dx = dV / E.
    const int steps = 20000;
    const double first = 1e-3 * te;
    double charge = 0;
    for (int i = 0; i < steps; ++i) {
        const double ratio = std::pow(drop / first, 1.0 / steps);
        const double low = first * std::pow(ratio, i), high = low * ratio;
        const double v = std::sqrt(low * high);
        const double ions = edge / std::sqrt(1 + 2 * v / te), electrons = edge * std::exp(-v / te);
        charge += (ions - electrons) * (high - low) / exact_wall_field(v, te, edge);
    }
    const double wall = -permittivity * exact_wall_field(drop, te, edge);
    CHECK(std::fabs(charge + wall) < 1e-4 * charge);
    CHECK(std::fabs(1.01 * charge + wall) > 1e-4 * charge);
}

TEST_CASE("plasma laws refuse what cannot be", "[plasma]") {
    CHECK_THROWS_AS(debye_length_nm(3, -1), std::invalid_argument);
    CHECK_THROWS_AS(debye_length_nm(0, 1e-10), std::invalid_argument);
    CHECK_THROWS_AS(bohm_speed(3, 0), std::invalid_argument);
    CHECK_THROWS_AS(gas_density(-1, 300), std::invalid_argument);
    CHECK_THROWS_AS(gas_density(1, 0), std::invalid_argument);
    CHECK_THROWS_AS(child_thickness_nm(-1, 3, 1e-10), std::invalid_argument);
    CHECK_THROWS_AS(collisional_thickness_nm(100, 3, 1e-10, 0), std::invalid_argument);
    CHECK_THROWS_AS(floating_drop_v(3, 1e-10, 1e9), std::invalid_argument);
    CHECK_THROWS_AS(electronegative_factor(-1, 2), std::invalid_argument);
    CHECK_THROWS_AS(exact_thickness_nm(1, 3, 1e-10, 2), std::invalid_argument);
}
