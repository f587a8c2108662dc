// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath_filter.hpp"
#include "tests/support/csv_table.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

constexpr double pi = 3.14159265358979323846;
const double edge = std::exp(-0.5) * 1e-10; ///< nm^-3, bulk 1e17 m^-3

Waveform swinging(double mean, double amplitude, double frequency) {
    return Waveform::sum_of({{frequency, amplitude, 0}}).raised_by(mean);
}
Sheath sheath_of(const Waveform& voltage) {
    return make_sheath(3, edge, voltage, std::numeric_limits<double>::infinity()).sheath;
}
double width(const Waveform& w) {
    return w.highest() - w.lowest();
}

} // namespace

TEST_CASE("slow sine: time spent at each voltage", "[sheath][filter]") {
    // Oracle: arcsine law of 200 +- 150 V: masses of four bins; mean 200, variance 11250, mean
    //         square root 13.5551580; share above 310.605 V 0.236068.
    // Source: constant flux in time, derived here. Tolerance: 1e-6; a mean 5 % off must fail.
    const Waveform slow = swinging(200, 150, 1e5);
    const double bins[4][3] = {
        {50, 60, 0.116886}, {50, 80, 0.204833}, {190, 210, 0.042473}, {320, 350, 0.204833}};
    for (const auto& bin : bins) {
        CHECK(std::fabs(time_shares(slow, {bin[0], bin[1]})[0] - bin[2]) < 1e-6);
        CHECK(std::fabs(time_shares(slow.raised_by(10), {bin[0], bin[1]})[0] - bin[2]) > 1e-5);
    }
    CHECK(std::fabs(time_shares(slow, {310.605, 350})[0] - 0.236068) < 1e-5);
    double sum = 0, squares = 0, roots = 0;
    for (double v : slow.volt) {
        sum += v, squares += (v - 200) * (v - 200), roots += std::sqrt(v);
    }
    const double n = double(slow.volt.size());
    CHECK(sum / n == Approx(200).epsilon(1e-9));
    CHECK(squares / n == Approx(11250).epsilon(1e-9));
    CHECK(roots / n == Approx(13.5551580).epsilon(1e-8));
    // The matrix sheath, V = Vmax [(1 - cos)/2]^2, by its three Fourier components.
    const Waveform matrix = Waveform::sum_of({{1e5, -0.5, 0}, {2e5, 0.125, 0}}).raised_by(0.375);
    const double cdf[4][2] = {{0.1, 0.380199}, {0.375, 0.572155}, {0.5, 0.635943}, {0.9, 0.854522}};
    CHECK(matrix.mean() == Approx(3 / 8.).epsilon(1e-12));
    for (const auto& row : cdf)
        CHECK(std::fabs(time_shares(matrix, {-1, row[0]})[0] - row[1]) < 1e-6);
    const auto all = time_shares(slow, {50, 100, 200, 300, 350});
    CHECK(all[0] + all[1] + all[2] + all[3] == Approx(1).epsilon(1e-6));
}

TEST_CASE("damping against trajectories over omega tau", "[sheath][filter]") {
    // Oracle: widths of trajectories in a Child sheath; relaxation by one time constant; mean
    // energy
    //         1.0239 and 1.0032 of the mean voltage at omega tau 1 and 10.
    // Source: computed here with a fourth-order Runge-Kutta rule. Tolerance: the fit is stated to
    //         6 %; relaxation 1e-3 (printed digits); mean 2e-3; tau / 1 instead of tau / 4 must
    //         fail.
    double worst = 0;
    for (auto& row : rille::tests::csv_table("sheath_widths.csv")) {
        const double omega_tau = row["omega_tau"];
        const double tau = omega_tau / (2 * pi * 1e6);
        const Waveform voltage = swinging(200, 100, 1e6);
        const double damped = width(damped_voltage(voltage, tau)) / 200;
        CHECK(damped == Approx(damping(omega_tau)).epsilon(1e-5));
        worst = std::max(worst, std::fabs(damped / row["child"] - 1));
        CHECK(width(relaxed_voltage(voltage, tau)) / 200 == Approx(row["relaxed_1"]).epsilon(1e-3));
        CHECK(width(relaxed_voltage(voltage, tau / 3)) / 200 ==
              Approx(row["relaxed_3"]).epsilon(1e-3));
        CHECK(width(relaxed_voltage(voltage, tau / 4)) / 200 ==
              Approx(row["relaxed_4"]).epsilon(1e-3));
        CHECK(damped_voltage(voltage, tau).mean() == Approx(200).epsilon(1e-12));
        CHECK(relaxed_voltage(voltage, tau).mean() == Approx(200).epsilon(1e-6));
        if (omega_tau >= 20) CHECK(damped == Approx(row["high_child"]).epsilon(0.01));
        if (omega_tau >= 5) CHECK(row["relaxed_1"] < 0.3 * row["child"]);
    }
    CHECK(worst < 0.061);
    CHECK(worst > 0.02);
    CHECK((1 + mean_gain(1, 0.5, 0.015)) * 1.015 == Approx(1.0239).epsilon(2e-3));
    CHECK((1 + mean_gain(10, 0.5, 0.015)) * 1.015 == Approx(1.0032).epsilon(2e-3));
    CHECK((1 + mean_gain(5, 0.5, 0.015)) == Approx(1.0839).epsilon(2e-3));
    CHECK(std::fabs(mean_gain(0.05, 0.5, 0.015)) < 1e-3);
    CHECK(std::fabs(mean_gain(3, 0, 0.015)) < 1e-3);
}

TEST_CASE("damping in a sheath with a moving edge", "[sheath][filter]") {
    // Oracle: full widths of trajectories under an edge that follows the square root of the
    // voltage,
    //         swing half of the mean, over omega s / v0 (a third of omega tau).
    // Source: computed here. Tolerance: the fit is stated to 4 %; the limit of a fixed Child sheath
    //         must fail.
    const double rows[7][2] = {{0.1, 0.9969}, {0.3, 0.9761}, {1, 0.7636}, {2, 0.4691},
                               {3, 0.3179},   {5, 0.2014},   {10, 0.1022}};
    double worst = 0, fixed = 0;
    for (const auto& row : rows) {
        worst = std::max(worst, std::fabs(damping(3 * row[0], 3) / row[1] - 1));
        fixed = std::max(fixed, std::fabs(damping(3 * row[0], 4) / row[1] - 1));
    }
    CHECK(worst < 0.04);
    CHECK(fixed > 0.2);
    Sheath sheath;
    sheath.edge = SheathEdge::moving;
    CHECK(damping_limit(sheath) == 3);
    sheath.edge = SheathEdge::fixed;
    CHECK(damping_limit(sheath) == Approx(4));
}

TEST_CASE("worked widths of four ions at four frequencies", "[sheath][filter]") {
    // Oracle: energy widths in eV of H+, Ar+, Cl2+, SF5+ at 0.4, 2, 13.56 and 60 MHz, 200 +- 150 V.
    // Source: the fitted damping and Child's law, derived here. Tolerance: 0.02 eV (printed
    // digits).
    struct Row {
        double mass;
        std::array<double, 4> width;
    };
    const Row rows[] = {{1.00728, {300.00, 299.99, 296.92, 193.52}},
                        {39.948, {299.98, 297.52, 144.99, 34.09}},
                        {70.906, {299.95, 294.26, 111.30, 25.59}},
                        {127.052, {299.89, 286.93, 83.99, 19.12}}};
    const std::array<double, 4> frequency = {0.4e6, 2e6, 13.56e6, 60e6};
    double last = 0;
    for (std::size_t f = 0; f < 4; ++f)
        for (const Row& row : rows) {
            const Sheath sheath = sheath_of(swinging(200, 150, frequency[f]));
            const double found =
                width(damped_voltage(sheath.voltage, transit_time_s(sheath, row.mass)));
            CHECK(std::fabs(found - row.width[f]) < 0.02);
            // Heavier ions give narrower spectra, so do higher frequencies.
            if (row.mass > 2) CHECK(found < last);
            if (f > 0) CHECK(found < row.width[f - 1]);
            last = found;
        }
    // Both in the limit of high frequencies: widths as the square root of the masses.
    const Sheath fast = sheath_of(swinging(200, 150, 2e9));
    CHECK(width(damped_voltage(fast.voltage, transit_time_s(fast, 1.00728))) /
              width(damped_voltage(fast.voltage, transit_time_s(fast, 39.948))) ==
          Approx(6.298).epsilon(1e-3));
}

TEST_CASE("measured width at omega tau 1.885", "[sheath][filter]") {
    // Oracle: 0.95 to 0.967 of the swing at a transit time of 0.3 periods.
    // Source: Jacobs, Gekelman, Pribyl, Barnes (2011) for the ratio, an average measured; the width
    //         from trajectories and the fit, computed here. Tolerance: 10 %.
    CHECK(damping(2 * pi * 0.3) == Approx(0.9585).epsilon(0.1));
    CHECK(damping(2 * pi * 0.3) == Approx(0.967).epsilon(1e-3));
    CHECK(damping(4 * pi * 0.3) != Approx(0.9585).epsilon(0.1));
}

TEST_CASE("several frequencies and pulses", "[sheath][filter]") {
    // Oracle: components do not know of each other; a rectangle with a period of five relaxation
    //         times spans 0.07586 to 0.92414.
    // Source: derived here. Tolerance: 1e-9 components; 2e-4 rectangle (edges of one sample).
    const double tau = 5e-8;
    const Waveform two = Waveform::sum_of({{2e6, 100, 0.3}, {26e6, 60, 1}}).raised_by(200);
    const Waveform damped = damped_voltage(two, tau);
    const double slow = damping(2 * pi * 2e6 * tau), fast = damping(2 * pi * 26e6 * tau);
    const Waveform expected =
        Waveform::sum_of({{2e6, 100 * slow, 0.3}, {26e6, 60 * fast, 1}}).raised_by(200);
    for (std::size_t i = 0; i < damped.volt.size(); ++i)
        if (std::fabs(damped.volt[i] - expected.volt[i]) > 1e-9) FAIL("component " << i);
    const Waveform pulse = Waveform::rectangular(1e6, 1, 0, 0.5);
    const Waveform relaxed = relaxed_voltage(pulse, 1e-6 / 5);
    CHECK(relaxed.lowest() == Approx(0.07586).margin(2e-4));
    CHECK(relaxed.highest() == Approx(0.92414).margin(2e-4));
    const Waveform filtered = damped_voltage(Waveform::rectangular(1e6, 500, 20, 0.3), 5e-8);
    CHECK(filtered.mean() == Approx(164).epsilon(1e-9));
    CHECK(filtered.lowest() > 20 - 0.01 * 480); // overshoot below 1 % of the step
    CHECK(filtered.highest() < 500 + 0.01 * 480);
}

TEST_CASE("arrivals of the closed form", "[sheath][filter]") {
    // Oracle: slow: the arcsine law, shifted by the entry energy of Te / 2; steady: thermal fall;
    //         mean energy = (mean voltage + Te / 2) (1 + gain), and the temperature along and
    //         across.
    // Source: derived here. Tolerance: 1e-3 of the mean energy, medians 1e-12.
    SheathIon argon;
    argon.name = "Ar+";
    argon.mass_amu = 39.948;
    argon.transverse_ev = 0.3;
    const Sheath slow = sheath_of(swinging(200, 150, 1e4));
    CHECK(damped_arrival(slow, argon).mean_energy_ev() == Approx(201.5 + 0.6).epsilon(1e-3));
    const Sheath steady = sheath_of(Waveform::steady(200));
    CHECK(damped_arrival(steady, argon).median_angle_deg() ==
          Approx(IonDistribution::thermal_fall(201.5, 0.3, 0.3).median_angle_deg()).epsilon(1e-12));
    for (double frequency : {0.4e6, 2e6, 6e6, 13.56e6, 60e6}) {
        const Sheath sheath = sheath_of(swinging(200, 150, frequency));
        const double omega_tau = 2 * pi * frequency * transit_time_s(sheath, argon.mass_amu);
        const double gain = mean_gain(omega_tau, 0.75, 1.5 / 200);
        const IonDistribution ions = damped_arrival(sheath, argon);
        CHECK(ions.mean_energy_ev() == Approx(201.5 * (1 + gain) + 0.6).epsilon(1e-3));
    }
    CHECK_THROWS_AS(damped_arrival(sheath_of(swinging(200, 250, 1e6)), argon),
                    std::invalid_argument);
    Sheath flat = slow;
    flat.thickness_nm = 0;
    CHECK_THROWS_AS(damped_arrival(flat, argon), std::invalid_argument);
    CHECK_THROWS_AS(damped_voltage(slow.voltage, -1), std::invalid_argument);
    CHECK_THROWS_AS(mean_gain(0, 0.5, 0.01), std::invalid_argument);
    CHECK_THROWS_AS(mean_gain(1, 1.5, 0.01), std::invalid_argument);
}

TEST_CASE("phases of a pulsed plasma are weighted by their flux", "[sheath][filter]") {
    // Oracle: sum of duty * flux * f over the sum of duty * flux; off phase at floating potential
    //         15.54 eV, full width at half maximum 13.43 deg for 15 V and 0.3 eV.
    // Source: derived here. Tolerance: 1e-9; angle 1e-3; unweighted shapes must fail.
    SheathIon argon;
    argon.name = "Ar+";
    argon.mass_amu = 39.948;
    argon.transverse_ev = 0.3;
    const IonDistribution on = damped_arrival(sheath_of(swinging(300, 200, 2e6)), argon);
    const double floating = floating_drop_v(3, edge, edge * bohm_speed(3, argon.mass_amu));
    const IonDistribution off = IonDistribution::thermal_fall(floating + 1.5, 0.3, 0);
    CHECK(off.mean_energy_ev() == Approx(15.54 + 0.3).epsilon(1e-3));
    const double duty = 0.3, flux_on = 160, flux_off = 40;
    const IonDistribution both =
        IonDistribution::mixture({duty * flux_on, (1 - duty) * flux_off}, {on, off});
    const double mean =
        (duty * flux_on * on.mean_energy_ev() + (1 - duty) * flux_off * off.mean_energy_ev()) /
        (duty * flux_on + (1 - duty) * flux_off);
    CHECK(both.mean_energy_ev() == Approx(mean).epsilon(1e-9));
    CHECK(both.mean_energy_ev() !=
          Approx(duty * on.mean_energy_ev() + (1 - duty) * off.mean_energy_ev()).epsilon(0.05));
    // Per solid angle, twice the median is the full width at half maximum.
    CHECK(2 * IonDistribution::thermal_fall(15, 0.3, 0).median_angle_deg() ==
          Approx(13.43).epsilon(1e-3));
}
