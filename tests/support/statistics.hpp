// SPDX-License-Identifier: Apache-2.0
// Tests on many pulls at once: "every point within three standard errors" fails a right code.
#pragma once

#include <algorithm>
#include <cmath>
#include <vector>

namespace rille::tests {

/// Summary of pulls (measured - expected) / standard error of independent bins.
struct Pulls {
    int count = 0;
    double chi2_per_bin = 0;
    double largest = 0;
    double mean = 0;

    explicit Pulls(const std::vector<double>& pulls) : count(static_cast<int>(pulls.size())) {
        for (const double p : pulls) {
            chi2_per_bin += p * p / count;
            mean += p / count;
            largest = std::max(largest, std::fabs(p));
        }
    }
    /// chi2 / nu within 1 +- 4 sqrt(2 / nu), largest pull < 4.5, mean pull < 4 / sqrt(n).
    bool agree() const {
        return std::fabs(chi2_per_bin - 1) < 4 * std::sqrt(2.0 / count) && largest < 4.5 &&
               std::fabs(mean) < 4 / std::sqrt(double(count));
    }
};

/// Mean of equally good values and its standard error from their spread.
struct Mean {
    double value = 0;
    double error = 0;
    explicit Mean(const std::vector<double>& values) {
        const double n = static_cast<double>(values.size());
        for (const double v : values)
            value += v / n;
        for (const double v : values)
            error += (v - value) * (v - value) / (n * (n - 1));
        error = std::sqrt(error);
    }
};

} // namespace rille::tests
