// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstdint>
#include <cstring>
#include <vector>

namespace rille::fluxes {

/// A smooth function of a positive argument at 32 nodes per octave, straight in between and
/// constant beyond the ends: a power law of exponent p errs by less than |p (p - 1)| / 8192.
/// Exponent and leading digits of the argument are the address, so that a look-up costs a few
/// cycles.
class OctaveTable {
public:
    OctaveTable() = default;
    /// Holds from 2^low to 2^high, low < high, both from -1000 to 1000.
    template <class Function>
    OctaveTable(int low, int high, Function&& function) {
        lowest_ = power(low);
        highest_ = power(high);
        first_ = address(lowest_);
        for (int octave = low; octave < high; ++octave)
            for (int i = 0; i < per_octave; ++i)
                value_.push_back(function(power(octave) * (1 + i / double(per_octave))));
        value_.push_back(function(highest_));
        value_.push_back(value_.back()); // the end itself lies in a piece of no slope
    }

    double operator()(double x) const {
        if (!(x > lowest_)) return value_.front();
        if (x >= highest_) return value_.back();
        const std::uint64_t bits = bits_of(x);
        const double* node = &value_[(bits >> rest_bits) - first_];
        const double part = double(static_cast<std::int64_t>(bits & rest_mask)) * rest_unit;
        return node[0] + part * (node[1] - node[0]);
    }

private:
    static constexpr int leading_bits = 5, per_octave = 1 << leading_bits;
    static constexpr int rest_bits = 52 - leading_bits;
    static constexpr std::uint64_t rest_mask = (std::uint64_t(1) << rest_bits) - 1;
    static constexpr double rest_unit = 1.0 / double(std::uint64_t(1) << rest_bits);

    static std::uint64_t bits_of(double x) {
        std::uint64_t bits;
        std::memcpy(&bits, &x, sizeof bits);
        return bits;
    }
    static double power(int exponent) {
        const std::uint64_t bits = std::uint64_t(exponent + 1023) << 52;
        double x;
        std::memcpy(&x, &bits, sizeof x);
        return x;
    }
    static std::uint64_t address(double x) { return bits_of(x) >> rest_bits; }

    double lowest_ = 1, highest_ = 1;
    std::uint64_t first_ = 0;
    std::vector<double> value_;
};

} // namespace rille::fluxes
