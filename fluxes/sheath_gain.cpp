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
    const std::vector<double>& voltage; ///< over its mean, the first sample again at the end
    double turns_per_time, longest_step, power, first_x;
    bool moving, child;

    double pull(double time, double phase, double x) const {
        const double turns = phase + time * turns_per_time;
        const double place = (turns - std::floor(turns)) * double(voltage.size() - 1);
        const auto i = std::min(static_cast<std::size_t>(place), voltage.size() - 2);
        const double v = voltage[i] + (place - double(i)) * (voltage[i + 1] - voltage[i]);
        // Uniform ions: zero at an edge sqrt(V) away from the wafer.
        if (moving) return std::max(0.0, x - (1 - std::sqrt(std::max(0.0, v))));
        const double y = std::max(0.0, x);
        return 0.5 * power * v * (child ? std::cbrt(y) : std::pow(y, power - 1));
    }

    /// Energy at the wafer of an ion that enters at `phase`, by Runge-Kutta steps.
    double arrival(double phase, double entry) const {
        double time = 0, x = first_x, v = std::sqrt(entry);
        const double slow = 0.1 * std::sqrt(entry) + 1e-3; // steps that grow with the flight
        while (time < 1e4) {
            const double h = std::min(longest_step, 0.1 * time + slow);
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

double mean_gain(const Waveform& voltage, double transit_s, double fastest_omega_tau, double entry,
                 double profile_power, SheathEdge edge) {
    const double mean = voltage.mean();
    if (!(entry > 0 && std::isfinite(entry)) || !(transit_s > 0) || !(voltage.period_s > 0) ||
        !(fastest_omega_tau > 0) || !(mean > 0) || !(voltage.lowest() >= 0))
        throw std::invalid_argument("the mean gain needs a swinging voltage that is not negative, "
                                    "an entry energy and a transit time above zero");
    std::vector<double> relative;
    for (double v : voltage.volt)
        relative.push_back(v / mean);
    relative.push_back(relative.front());
    const double turns = transit_s / voltage.period_s / 3; // per width over v0
    const bool moving = edge == SheathEdge::moving;
    const Swung sheath{relative,
                       turns,
                       std::clamp(2 * pi / (fastest_omega_tau / 3) / 40, 0.004, 0.04),
                       profile_power,
                       moving ? 1 - std::sqrt(voltage.highest() / mean) : 0.0,
                       moving,
                       std::fabs(profile_power - 4 / 3.) < 1e-9};
    // One sine is smooth: few phases do.
    const bool one_cycle = std::fabs(2 * pi * turns * 3 - fastest_omega_tau) < 1e-9;
    const int phases = one_cycle ? 48 : 256;
    double sum = 0;
    for (int k = 0; k < phases; ++k)
        sum += sheath.arrival((k + 0.5) / phases, entry);
    return sum / phases / (1 + entry) - 1;
}

double mean_gain(double omega_tau, double swing, double entry, double profile_power,
                 SheathEdge edge) {
    if (!(omega_tau > 0 && std::isfinite(omega_tau)) || !(swing >= 0 && swing <= 1))
        throw std::invalid_argument(
            "the mean gain needs a frequency above zero, a swing of 0 to 1");
    const double frequency = omega_tau / (2 * pi); // transit time 1
    const Waveform voltage = Waveform::sum_of({{frequency, swing, 0}}).raised_by(1 + 1e-12);
    return mean_gain(voltage, 1, omega_tau, entry, profile_power, edge);
}

} // namespace rille::fluxes
