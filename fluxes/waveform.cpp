// SPDX-License-Identifier: Apache-2.0
#include "fluxes/waveform.hpp"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numeric>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
/// Straight lines between this many samples of a sine miss it by 3e-7 of the amplitude.
constexpr std::size_t fewest_samples = 4096;
constexpr std::size_t most_samples = std::size_t(1) << 20;
constexpr std::size_t samples_per_cycle = 64;

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Largest frequency that divides all of them: the lowest one if it does, else to 1 kHz.
double common_frequency(const std::vector<BiasComponent>& parts) {
    double lowest = parts.front().frequency_hz;
    for (const BiasComponent& part : parts)
        lowest = std::min(lowest, part.frequency_hz);
    const bool harmonic = std::all_of(parts.begin(), parts.end(), [&](const BiasComponent& part) {
        const double ratio = part.frequency_hz / lowest;
        return std::fabs(ratio - std::round(ratio)) < 1e-9 * ratio;
    });
    if (harmonic) return lowest;
    std::int64_t divisor = 0;
    for (const BiasComponent& part : parts) {
        const double khz = part.frequency_hz / 1e3;
        require(std::fabs(std::round(khz) - khz) < 1e-3 * khz,
                "several bias frequencies need a common period: whole kHz or harmonics of one");
        divisor = std::gcd(divisor, std::int64_t(std::llround(khz)));
    }
    return 1e3 * double(divisor);
}

} // namespace

Waveform Waveform::steady(double volt) {
    require(std::isfinite(volt), "a steady voltage must be finite");
    return {0.0, {volt}};
}

Waveform Waveform::sum_of(const std::vector<BiasComponent>& parts) {
    require(!parts.empty(), "a bias waveform needs at least one component");
    for (const BiasComponent& part : parts) {
        require(std::isfinite(part.frequency_hz) && part.frequency_hz > 0,
                "a bias component needs a frequency above 0 Hz");
        require(std::isfinite(part.amplitude_v) && std::isfinite(part.phase_rad),
                "the amplitude and phase of a bias component must be finite");
    }
    const double base = common_frequency(parts);
    double fastest = 0;
    for (const BiasComponent& part : parts)
        fastest = std::max(fastest, std::round(part.frequency_hz / base));
    require(fastest * samples_per_cycle <= double(most_samples),
            "the bias frequencies have too long a common period: choose rounder ones");
    std::size_t count = fewest_samples;
    while (double(count) < fastest * samples_per_cycle)
        count *= 2;
    Waveform sum{1.0 / base, std::vector<double>(count, 0.0)};
    for (const BiasComponent& part : parts) {
        const auto cycles = static_cast<std::size_t>(std::llround(part.frequency_hz / base));
        for (std::size_t i = 0; i < count; ++i) {
            // Whole cycles taken out exactly, so that every period holds the same numbers.
            const double cycle = double((i * cycles) % count) / double(count);
            sum.volt[i] += part.amplitude_v * std::cos(2 * pi * cycle + part.phase_rad);
        }
    }
    return sum;
}

Waveform Waveform::rectangular(double frequency_hz, double high_v, double low_v, double duty) {
    require(std::isfinite(frequency_hz) && frequency_hz > 0,
            "a pulsed bias needs a frequency above 0 Hz");
    require(std::isfinite(high_v) && std::isfinite(low_v), "pulse voltages must be finite");
    require(duty > 0 && duty < 1, "the duty of a pulsed bias must lie between 0 and 1");
    Waveform pulse{1.0 / frequency_hz, std::vector<double>(fewest_samples, low_v)};
    const double on = duty * fewest_samples;
    const auto whole = static_cast<std::size_t>(on);
    std::fill_n(pulse.volt.begin(), whole, high_v);
    pulse.volt[whole] = low_v + (high_v - low_v) * (on - double(whole)); // keeps the mean exact
    return pulse;
}

Waveform Waveform::raised_by(double volt_added) const {
    Waveform raised = *this;
    for (double& v : raised.volt)
        v += volt_added;
    return raised;
}

double Waveform::mean() const {
    return std::accumulate(volt.begin(), volt.end(), 0.0) / double(volt.size());
}

double Waveform::lowest() const {
    return *std::min_element(volt.begin(), volt.end());
}

double Waveform::highest() const {
    return *std::max_element(volt.begin(), volt.end());
}

double Waveform::at(double time_s) const {
    if (is_steady()) return volt.front();
    const double cycle = time_s / period_s;
    const double x = (cycle - std::floor(cycle)) * double(volt.size());
    const std::size_t i = static_cast<std::size_t>(x) % volt.size();
    const double part = std::min(x - double(i), 1.0);
    const double next = volt[(i + 1) % volt.size()];
    return volt[i] + std::max(part, 0.0) * (next - volt[i]);
}

} // namespace rille::fluxes
