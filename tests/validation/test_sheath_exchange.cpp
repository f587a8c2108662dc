// SPDX-License-Identifier: Apache-2.0
// What charge exchange makes of the energies, against published observations.
#include "fluxes/cross_sections.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/sheath_cases.hpp"
#include "tests/support/statistics.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

/// Maxima of the energies in steps of 2 % of the mean voltage that stand `rise` times above the
/// lowest step on either side before a higher one.
int count_peaks(const std::vector<Arrival>& arrivals, double mean_v, double rise) {
    std::vector<double> steps(60, 0.0);
    for (const auto& a : arrivals)
        steps[std::min<std::size_t>(59, std::size_t(a.energy_ev / (0.02 * mean_v)))] += 1;
    int peaks = 0;
    for (std::size_t i = 1; i + 1 < steps.size(); ++i) {
        double left = steps[i], right = steps[i];
        std::size_t l = i, r = i;
        while (l > 0 && steps[l - 1] <= steps[i])
            left = std::min(left, steps[--l]);
        while (r + 1 < steps.size() && steps[r + 1] < steps[i])
            right = std::min(right, steps[++r]);
        const bool summit = l < i && r > i && l > 0;
        peaks += summit && steps[i] > rise * std::max({left, right, 1.0});
    }
    return peaks;
}

} // namespace

TEST_CASE("charge exchange in a swinging sheath leaves peaks", "[sheath]") {
    // Oracle: several peaks below the mean voltage at a grounded electrode of a capacitive argon
    // discharge with a parabolic mean potential: ions born at rest gather until the edge sweeps
    // over them, and fall whole periods later. None at a steady voltage. Source: EPFL, radio
    // frequency argon discharge (1995), for the peaks and the parabola; number from the model.
    // Tolerance: at least three peaks a third above their surroundings, against none.
    Sheath sheath = swinging_sheath(2, 0.95, 40, 39.948);
    for (double& v : sheath.voltage.volt)
        v *= 0.5;
    sheath.voltage.period_s *= 4 * std::sqrt(2.0);
    sheath.electron_temperature_ev = 3;
    sheath.thickness_nm = 4e6;
    sheath.edge = SheathEdge::moving;
    SheathIon ion = argon_ion(0.05);
    ion.collisions = argon_in_argon(gas_density(50));
    CHECK(count_peaks(follow_ions(sheath, ion, {100000, 1}).ions, 100, 1.33) >= 3);
    sheath.voltage = Waveform::steady(100);
    CHECK(count_peaks(follow_ions(sheath, ion, {100000, 1}).ions, 100, 1.33) == 0);
}

TEST_CASE("ions in a thick uniform field", "[sheath]") {
    // Oracle: exponential energies of temperature (E/N) / sigma where resonant charge exchange
    // dominates: 10e-18 V m^2 over 2e-19 m^2 is 50 eV. Source: Rao, Van Brunt & Olthoff, Phys. Rev.
    // E (1999), for the shape in O2; temperature derived here. Tolerance: each eighth
    // of the ions within 4 standard errors, from the spread of 16 seeds; a cross section 3 % off
    // must fail.
    const auto worst_pull = [](double factor) {
        std::vector<std::vector<double>> share(8, std::vector<double>(16, 0.0));
        for (int seed = 0; seed < 16; ++seed) {
            const double density = gas_density(100);             // [nm^-3]
            const double field = 10e-18 * density * 1e27 * 1e-9; // [V/nm]
            Sheath sheath;
            sheath.electron_temperature_ev = 1e-3;
            sheath.profile_power = 1;
            sheath.thickness_nm = 12 / (density * 0.2);
            sheath.voltage = Waveform::steady(field * sheath.thickness_nm);
            SheathIon ion = argon_ion(0, 0);
            ion.mass_amu = 31.998;
            ion.collisions = {constant_process(CollisionProcess::Kind::charge_exchange, "O2",
                                               31.998, density, 0.2 * factor)};
            for (const auto& a : follow_ions(sheath, ion, {4096, std::uint64_t(seed)}).ions)
                share[std::min(7, int(-8 * std::expm1(-a.energy_ev / 50)))][seed] += 1 / 4096.0;
        }
        double worst = 0;
        for (const auto& values : share) {
            const Mean mean(values);
            worst = std::max(worst, std::fabs(mean.value - 0.125) / mean.error);
        }
        return worst;
    };
    CHECK(worst_pull(1) < 4);
    CHECK(worst_pull(1.03) > 4);
}
