// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <vector>

namespace rille::fluxes {

/// One sinusoidal part of a bias voltage: amplitude * cos(2 pi frequency t + phase).
struct BiasComponent {
    double frequency_hz = 0;
    double amplitude_v = 0;
    double phase_rad = 0;
};

/// A periodic voltage, sampled evenly over one period: volt[i] holds at i / size of the period and
/// the samples are joined by straight lines. A steady voltage has one sample and period 0.
struct Waveform {
    double period_s = 0;
    std::vector<double> volt;

    static Waveform steady(double volt);
    /// The period is that of the largest frequency that divides all of them (to 1 kHz); at least 64
    /// samples a period of the fastest part. Throws std::invalid_argument if none is above zero or
    /// the common period would hold more than 2^20 samples.
    static Waveform sum_of(const std::vector<BiasComponent>&);
    /// `duty` of the period at `high_v`, the rest at `low_v`, 0 < duty < 1.
    static Waveform rectangular(double frequency_hz, double high_v, double low_v, double duty);

    bool is_steady() const { return volt.size() == 1; }
    double mean() const;
    double lowest() const;
    double highest() const;
    /// At any time, periodic.
    double at(double time_s) const;
};

} // namespace rille::fluxes
