// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cmath>

namespace rille::tests {

/// Ions that only exchange their charge, in a cold gas of constant mean free path: the energy at
/// the wall, over the drop, is the drop from the last exchange on. Potential ~ x^power,
/// `free_paths` = sheath over mean free path. Source: Davis & Vanderslice, Phys. Rev. 131 (1963)
/// 219, from memory; derived here.
struct DavisVanderslice {
    double free_paths, power;

    double uncollided() const { return std::exp(-free_paths); }
    double density(double share) const {
        return free_paths / power * std::pow(1 - share, 1 / power - 1) *
               std::exp(-free_paths * (1 - std::pow(1 - share, 1 / power)));
    }
    /// Below 1; the uncollided come on top.
    double below(double share) const {
        return -std::expm1(-free_paths * (1 - std::pow(1 - share, 1 / power)));
    }
    /// Energy share below which `probability` of the ions lie; the collided only.
    double quantile(double probability) const {
        return 1 - std::pow(1 + std::log1p(-probability) / free_paths, power);
    }
    double mean() const {
        double sum = 0;
        const int steps = 20000; // Simpson's rule
        for (int i = 0; i <= steps; ++i) {
            const double y = double(i) / steps;
            const double weight = i == 0 || i == steps ? 1 : i % 2 ? 4 : 2;
            sum += weight / (3.0 * steps) * power * std::pow(1 - y, power - 1) *
                   std::exp(-free_paths * y);
        }
        return sum;
    }
};

} // namespace rille::tests
