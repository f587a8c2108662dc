// SPDX-License-Identifier: Apache-2.0
// How counts are compared with expected probabilities in tests.
#pragma once

#include <algorithm>
#include <cmath>
#include <vector>

namespace rille::tests {

/// Normalised deviations of many independent counts. "Every bin within three standard errors" fails
/// a right code; the three figures here do not, and they see a common bias of a fraction of one
/// standard error.
struct Pulls {
    double chi2_per_bin = 0, largest = 0, mean = 0;
    int bins = 0;

    /// Fixed limits: 4 standard deviations of chi^2 per bin and of the mean pull, 4.5 for the
    /// worst.
    bool pass() const {
        return std::fabs(chi2_per_bin - 1) < 4 * std::sqrt(2.0 / bins) && largest < 4.5 &&
               std::fabs(mean) < 4 / std::sqrt(double(bins));
    }
};

/// hits[i] of `tries` independent rays against probability p[i].
inline Pulls binomial_pulls(const std::vector<double>& hits, const std::vector<double>& p,
                            double tries) {
    Pulls r;
    for (std::size_t i = 0; i < p.size(); ++i) {
        const double pull = (hits[i] - tries * p[i]) / std::sqrt(tries * p[i] * (1 - p[i]));
        r.chi2_per_bin += pull * pull;
        r.mean += pull;
        r.largest = std::max(r.largest, std::fabs(pull));
        ++r.bins;
    }
    r.chi2_per_bin /= r.bins;
    r.mean /= r.bins;
    return r;
}

} // namespace rille::tests
