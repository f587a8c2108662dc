// SPDX-License-Identifier: Apache-2.0
// Sheaths and figures of arrivals that several tests need.
#pragma once

#include "fluxes/sheath_trajectories.hpp"

#include <algorithm>
#include <cmath>
#include <vector>

namespace rille::tests {

constexpr double sheath_pi = 3.14159265358979323846;

/// Speed [nm/s] of an energy [eV].
inline double speed_of(double energy_ev, double mass_amu) {
    return 1e9 * std::sqrt(2 * 1.602176634e-19 * energy_ev / (1.66053906660e-27 * mass_amu));
}

inline fluxes::Waveform sine_voltage(double mean, double swing, double period_s,
                                     int samples = 1024) {
    fluxes::Waveform wave;
    wave.period_s = period_s;
    for (int i = 0; i < samples; ++i)
        wave.volt.push_back(mean + swing * std::sin(2 * sheath_pi * i / samples));
    return wave;
}

/// A sheath of 200 V mean and 1 mm in which `omega_transit` = 2 pi times the transit time 3 s / v0
/// over the period; ions enter with 1.5 % of the mean drop, as in the width table.
inline fluxes::Sheath swinging_sheath(double power, double swing, double omega_transit,
                                      double mass_amu) {
    fluxes::Sheath sheath;
    sheath.thickness_nm = 1e6;
    sheath.profile_power = power;
    sheath.electron_temperature_ev = 2 * 0.015 * 200;
    const double transit = 3 * sheath.thickness_nm / speed_of(200, mass_amu);
    sheath.voltage = sine_voltage(200, 200 * swing, 2 * sheath_pi * transit / omega_transit);
    return sheath;
}

inline fluxes::SheathIon argon_ion(double transverse_ev = 0, double gas_k = 300) {
    fluxes::SheathIon ion;
    ion.name = "Ar+";
    ion.mass_amu = 39.948;
    ion.transverse_ev = transverse_ev;
    ion.gas_temperature_k = gas_k;
    return ion;
}

/// Density of a gas at 300 K [nm^-3] by its pressure in mTorr.
inline double gas_density(double mtorr) {
    return mtorr * 0.13332237 / (1.380649e-23 * 300) * 1e-27;
}

struct EnergyFigures {
    double mean = 0, deviation = 0, lowest = 1e300, highest = 0;
};
inline EnergyFigures energy_figures(const std::vector<fluxes::Arrival>& arrivals) {
    EnergyFigures f;
    for (const auto& a : arrivals) {
        f.mean += a.energy_ev / double(arrivals.size());
        f.lowest = std::min(f.lowest, a.energy_ev);
        f.highest = std::max(f.highest, a.energy_ev);
    }
    for (const auto& a : arrivals)
        f.deviation += (a.energy_ev - f.mean) * (a.energy_ev - f.mean) / double(arrivals.size());
    f.deviation = std::sqrt(f.deviation);
    return f;
}

/// Angle [deg] within which `share` of the arrivals lies.
inline double angle_quantile_deg(const std::vector<fluxes::Arrival>& arrivals, double share) {
    std::vector<double> tangent;
    for (const auto& a : arrivals)
        tangent.push_back(a.tangent);
    const auto at = tangent.begin() + std::ptrdiff_t(share * double(tangent.size() - 1));
    std::nth_element(tangent.begin(), at, tangent.end());
    return std::atan(*at) * 180 / sheath_pi;
}

} // namespace rille::tests
