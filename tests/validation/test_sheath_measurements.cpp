// SPDX-License-Identifier: Apache-2.0
// Ions at a surface against published measurements.
#include "fluxes/cross_sections.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/sheath_cases.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

/// Electron temperature [eV] at which ionisation makes up for the ions lost to the walls of a
/// cylinder of argon: rate 2.34e-14 T^0.59 exp(-17.44 / T) m^3/s, edge densities of Godyak, mean
/// free path 1 / (330 p) cm. Lieberman & Lichtenberg ch. 3, 5 and 10, from memory.
double balanced_temperature_ev(double mtorr, double radius_m, double height_m) {
    const double path = 0.01 / (330 * 1e-3 * mtorr);
    const double h_l = 0.86 / std::sqrt(3 + height_m / (2 * path));
    const double h_r = 0.80 / std::sqrt(4 + radius_m / path);
    const double length = 0.5 * radius_m * height_m / (radius_m * h_l + height_m * h_r);
    const double density = gas_density(mtorr) * 1e27;
    double low = 1, high = 10;
    for (int i = 0; i < 60; ++i) {
        const double t = 0.5 * (low + high);
        const double made = density * length * 2.34e-14 * std::pow(t, 0.59) * std::exp(-17.44 / t);
        (made < 1e-9 * speed_of(0.5 * t, 39.948) ? low : high) = t;
    }
    return low;
}

struct GroundedElectrode {
    double mean_ev, half_width_deg;
};

/// An argon plasma over a grounded electrode that draws no net current: the sheath is that of a
/// floating wall and five Debye lengths thick.
GroundedElectrode grounded_electrode(double mtorr, double transverse_ev, double edge_m3) {
    Sheath sheath;
    sheath.electron_temperature_ev = balanced_temperature_ev(mtorr, 0.0825, 0.0405);
    const double t = sheath.electron_temperature_ev;
    sheath.voltage = Waveform::steady(4.6789 * t); // ln sqrt(M / (2 pi m))
    sheath.thickness_nm = 5 * 5.22821e4 * std::sqrt(t / 3 * 6.06531e16 / edge_m3);
    SheathIon ion = argon_ion(transverse_ev);
    ion.collisions = argon_in_argon(gas_density(mtorr));
    const Arrivals r = follow_ions(sheath, ion, {40000, 1});
    // The share 1 - 1/e lies within the angle at which the intensity has fallen to 1/e.
    return {energy_figures(r.ions).mean, angle_quantile_deg(r.ions, 1 - std::exp(-1.0))};
}

} // namespace

TEST_CASE("argon ions at a grounded electrode of an inductive plasma", "[sheath]") {
    // Oracle: mean energy 29 to 12 eV and half-width in angle 5 to 12.5 deg from 2.4 to 50 mTorr
    // with transverse temperatures of 0.2 to 0.5 eV; mean energy independent of the power. Source:
    // Woodworth, Riley & Meister, Sandia report, OSTI 212756 (1996); size of the cell (radius
    // 82.5 mm, gap 40.5 mm) from memory.
    // Tolerance: nothing is fitted. The model's plasma potential is that of a floating wall at the
    // temperature of the particle balance; energies come out 20 % low at 2.4 mTorr and 7 % low at
    // 50 mTorr, so the bounds are 25 % and 10 %. The half-widths, given the measured transverse
    // temperatures, come out 6 % wide and 11 % narrow: 10 % and 15 %. These temperatures were
    // derived from the same angles, so that part checks the transport and not the source. The
    // temperature of the other pressure fails.
    const GroundedElectrode low = grounded_electrode(2.4, 0.2, 6e16);
    const GroundedElectrode high = grounded_electrode(50, 0.5, 6e16);
    INFO("2.4 mTorr: " << low.mean_ev << " eV of 29, " << low.half_width_deg << " deg of 5");
    INFO("50 mTorr: " << high.mean_ev << " eV of 12, " << high.half_width_deg << " deg of 12.5");
    CHECK(low.mean_ev == Approx(29).epsilon(0.25));
    CHECK(high.mean_ev == Approx(12).epsilon(0.10));
    CHECK(low.half_width_deg == Approx(5).epsilon(0.10));
    CHECK(high.half_width_deg == Approx(12.5).epsilon(0.15));
    CHECK(grounded_electrode(2.4, 0.5, 6e16).half_width_deg != Approx(5).epsilon(0.10));
    const double dense = grounded_electrode(10, 0.3, 2.4e17).mean_ev;
    CHECK(grounded_electrode(10, 0.3, 6e16).mean_ev == Approx(dense).epsilon(0.03));
}

TEST_CASE("ions at a biased wafer of an industrial tool at 2.2 MHz", "[sheath]") {
    // Oracle: transit time 0.3 of the period: two peaks, at a distance of 0.95 of the swing of the
    // voltage. Source: Jacobs, Gekelman, Pribyl & Barnes, Phys. Plasmas 18 (2011) 053503 for the
    // transit time and the two peaks; distance computed. Tolerance: 10 %, the transit time being
    // an average; the width at three times the transit time must fail.
    const double swing_v = 100;
    const auto width = [&](double omega_transit, double& ends, double& middle) {
        const auto ions =
            follow_ions(swinging_sheath(4 / 3., 0.5, omega_transit, 39.948), argon_ion(), {8192, 1})
                .ions;
        const EnergyFigures f = energy_figures(ions);
        ends = middle = 0;
        for (const auto& a : ions) {
            const double place = (a.energy_ev - f.lowest) / (f.highest - f.lowest);
            ends += std::fabs(place - 0.5) > 0.45;
            middle += std::fabs(place - 0.5) < 0.05;
        }
        return (f.highest - f.lowest) / (2 * swing_v);
    };
    double ends = 0, middle = 0;
    const double measured = width(0.3 * 2 * sheath_pi, ends, middle);
    CAPTURE(measured, ends, middle);
    CHECK(measured == Approx(0.95).epsilon(0.10));
    CHECK(ends > 4 * middle);
    CHECK(width(0.9 * 2 * sheath_pi, ends, middle) != Approx(0.95).epsilon(0.10));
}

TEST_CASE("width of the energies for four ions and four frequencies", "[sheath]") {
    // Oracle: width [eV] at a mean of 200 V and a swing of 150 V over 0.96706 mm. Source: the
    // filter [1 + (omega tau_i / 4)^3]^(-1/3) fitted to trajectories, derived here. Tolerance:
    // 7 %: the fit is good to 6 % at a smaller swing. Ions of twice the mass fail where the width
    // depends on it.
    struct Row {
        const char* ion;
        double mass;
        std::array<double, 4> width;
    };
    const std::array<double, 4> mhz = {0.4, 2, 13.56, 60};
    const std::array<Row, 4> rows = {{{"H+", 1.00728, {300.00, 299.99, 296.92, 193.52}},
                                      {"Ar+", 39.948, {299.98, 297.52, 144.99, 34.09}},
                                      {"Cl2+", 70.906, {299.95, 294.26, 111.30, 25.59}},
                                      {"SF5+", 127.052, {299.89, 286.93, 83.99, 19.12}}}};
    const auto width = [&](double mass, double megahertz) {
        Sheath sheath = swinging_sheath(4 / 3., 0.75, 1, mass);
        sheath.electron_temperature_ev = 3;
        sheath.thickness_nm = 0.96706e6;
        sheath.voltage.period_s = 1e-6 / megahertz;
        SheathIon ion = argon_ion();
        ion.mass_amu = mass;
        const auto f = energy_figures(follow_ions(sheath, ion, {4096, 1}).ions);
        return f.highest - f.lowest;
    };
    std::array<double, 4> lighter{};
    for (const Row& row : rows)
        for (std::size_t i = 0; i < mhz.size(); ++i) {
            const double measured = width(row.mass, mhz[i]);
            CAPTURE(row.ion, mhz[i], measured, measured / row.width[i]);
            CHECK(measured == Approx(row.width[i]).epsilon(0.07));
            // Heavier ions and higher frequencies give narrower peaks.
            if (&row != &rows.front()) CHECK(measured < lighter[i]);
            if (i > 0) CHECK(measured < lighter[i - 1]);
            lighter[i] = measured;
            if (row.width[i] < 150)
                CHECK(width(2 * row.mass, mhz[i]) != Approx(row.width[i]).epsilon(0.07));
        }
}

TEST_CASE("limits of slow and fast voltages", "[sheath]") {
    // Oracle: width as one over frequency and root mass where omega tau_i is above 15, H+ to Ar+
    // 6.298; independent of both below 0.3. Source: Coburn & Kay, J. Appl. Phys. 43 (1972) 4965
    // for the mass, from memory; derived here. Tolerance: 3 % and 0.5 %.
    const auto width = [](double mass, double frequency) {
        Sheath sheath = swinging_sheath(4 / 3., 0.3, 1, mass);
        sheath.electron_temperature_ev = 3;
        sheath.voltage.period_s = 1 / frequency;
        SheathIon ion = argon_ion();
        ion.mass_amu = mass;
        const auto f = energy_figures(follow_ions(sheath, ion, {4096, 1}).ions);
        return f.highest - f.lowest;
    };
    const double transit_h = 3e6 / speed_of(200, 1.00728), turn = 2 * sheath_pi;
    CHECK(width(1.00728, 60 / (turn * transit_h)) / width(39.948, 60 / (turn * transit_h)) ==
          Approx(6.298).epsilon(0.03));
    CHECK(width(1.00728, 40 / (turn * transit_h)) / width(1.00728, 80 / (turn * transit_h)) ==
          Approx(2).epsilon(0.03));
    const double slow = 0.3 / (turn * transit_h * std::sqrt(39.948 / 1.00728));
    CHECK(width(1.00728, slow) == Approx(120).epsilon(5e-3));
    CHECK(width(39.948, slow) == Approx(120).epsilon(5e-3));
    CHECK(width(39.948, 0.5 * slow) == Approx(120).epsilon(5e-3));
}

TEST_CASE("more pressure widens the angles and lowers the energies", "[sheath]") {
    // Oracle: mean energy falls, the median angle and the share beyond 10 deg rise with the
    // pressure, at a steady and at a swinging voltage. Source: common practice, no source.
    // Tolerance: each step by more than four standard errors of eight batches.
    for (const double swing : {0.0, 0.9}) {
        double before = 1e9, before_error = 0, angle = 0, tail = 0;
        for (const double mtorr : {0.0, 3.0, 10.0, 30.0, 100.0}) {
            Sheath sheath = swinging_sheath(4 / 3., 0.9, 4, 39.948);
            if (swing == 0) sheath.voltage = Waveform::steady(200);
            SheathIon ion = argon_ion(0.05);
            ion.collisions = argon_in_argon(gas_density(mtorr));
            const auto ions = follow_ions(sheath, ion, {16384, 1}).ions;
            double sum = 0, square = 0, beyond = 0;
            for (int b = 0; b < 8; ++b) {
                double mean = 0;
                for (int i = 0; i < 2048; ++i) {
                    mean += ions[b * 2048 + i].energy_ev / 2048;
                    beyond += ions[b * 2048 + i].tangent > std::tan(10 * sheath_pi / 180);
                }
                sum += mean / 8;
                square += mean * mean / 8;
            }
            const double error = std::sqrt(std::max(0.0, square - sum * sum) / 7);
            const double median = angle_quantile_deg(ions, 0.5);
            CAPTURE(swing, mtorr, sum, error, median, beyond);
            CHECK(sum < before - 4 * std::hypot(error, before_error));
            CHECK(median > angle);
            CHECK((beyond > tail || mtorr == 0));
            before = sum;
            before_error = error;
            angle = median;
            tail = beyond;
        }
    }
}
