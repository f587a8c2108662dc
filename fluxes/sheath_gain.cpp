// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_filter.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

/// A sheath without units: x in sheath widths from the edge, time in widths over v0, energies in
/// mean voltages, so that the square of a speed is an energy.
struct Swung {
    double omega, swing, power;
    bool moving, child;

    double pull(double time, double phase, double x) const {
        const double voltage = 1 + swing * std::sin(omega * time + phase);
        if (moving) // uniform ions: field 2 V / s at the wall, zero at an edge sqrt(V) away from it
            return std::max(0.0, x - (1 - std::sqrt(std::max(0.0, voltage))));
        const double y = std::max(0.0, x);
        return 0.5 * power * voltage * (child ? std::cbrt(y) : std::pow(y, power - 1));
    }

    /// Energy at the wafer of an ion that enters at `phase`, by Runge-Kutta steps.
    double arrival(double phase, double entry) const {
        double time = 0, x = moving ? 1 - std::sqrt(1 + swing) : 0, v = std::sqrt(entry);
        const double longest = std::min(0.04, 2 * pi / omega / 40);
        const double slow = 0.1 * std::sqrt(entry) + 1e-3; // steps that grow with the flight
        while (time < 1e4) {
            const double h = std::min(longest, 0.1 * time + slow);
            const double a1 = pull(time, phase, x);
            const double v2 = v + 0.5 * h * a1;
            const double a2 = pull(time + 0.5 * h, phase, x + 0.5 * h * v);
            const double v3 = v + 0.5 * h * a2;
            const double a3 = pull(time + 0.5 * h, phase, x + 0.5 * h * v2);
            const double v4 = v + h * a3;
            const double a4 = pull(time + h, phase, x + h * v3);
            const double next = x + h / 6 * (v + 2 * v2 + 2 * v3 + v4);
            const double faster = v + h / 6 * (a1 + 2 * a2 + 2 * a3 + a4);
            if (next >= 1) {
                // Time to the wafer from x, v and a mean acceleration.
                const double a = 0.5 * (a1 + a4), way = 1 - x;
                const double t = 2 * way / (v + std::sqrt(std::max(0.0, v * v + 2 * a * way)));
                const double there = v + (faster - v) * std::min(1.0, t / h);
                return there * there;
            }
            x = next;
            v = faster;
            time += h;
        }
        throw std::invalid_argument("ions do not cross this sheath");
    }
};

} // namespace

double mean_gain(double omega_tau, double swing, double entry, double profile_power,
                 SheathEdge edge) {
    if (!(omega_tau > 0 && std::isfinite(omega_tau)) || !(swing >= 0 && swing <= 1) ||
        !(entry > 0 && std::isfinite(entry)))
        throw std::invalid_argument(
            "the mean gain needs a frequency and an entry energy above zero, a swing of 0 to 1");
    constexpr int phases = 48;
    const bool child = std::fabs(profile_power - 4 / 3.) < 1e-9;
    const Swung sheath{omega_tau / 3, swing, profile_power, edge == SheathEdge::moving, child};
    double sum = 0;
    for (int k = 0; k < phases; ++k)
        sum += sheath.arrival(2 * pi * (k + 0.5) / phases, entry);
    return sum / phases / (1 + entry) - 1;
}

} // namespace rille::fluxes
