// SPDX-License-Identifier: Apache-2.0
// Ratios of two timings taken in one process, repeats interleaved so that both see the same machine.
#pragma once

#include <algorithm>
#include <chrono>
#include <utility>
#include <vector>

namespace rille::bench {

inline double median(std::vector<double> v) {
    std::sort(v.begin(), v.end());
    const std::size_t n = v.size();
    return n % 2 ? v[n / 2] : 0.5 * (v[n / 2 - 1] + v[n / 2]);
}

template <class Work> double seconds(Work&& work) {
    const auto start = std::chrono::steady_clock::now();
    work();
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
}

struct Comparison {
    double ours = 0;   ///< median time [s]
    double theirs = 0; ///< median time [s]
    double ratio = 0;  ///< median of theirs / ours, pair by pair; above 1 we are faster
};

/// One unmeasured pair first, then `repeats` measured pairs.
template <class Ours, class Theirs> Comparison compare(int repeats, Ours ours, Theirs theirs) {
    ours();
    theirs();
    std::vector<double> a, b, ratio;
    for (int n = 0; n < repeats; ++n) {
        a.push_back(seconds(ours));
        b.push_back(seconds(theirs));
        ratio.push_back(b.back() / a.back());
    }
    return {median(a), median(b), median(ratio)};
}

} // namespace rille::bench
