// SPDX-License-Identifier: Apache-2.0
// Ratios of two timings taken in one process, repeats interleaved so that both see the same
// machine.
#pragma once

#include <algorithm>
#include <chrono>
#include <ctime>
#include <utility>
#include <vector>

namespace rille::bench {

inline double median(std::vector<double> v) {
    std::sort(v.begin(), v.end());
    const std::size_t n = v.size();
    return n % 2 ? v[n / 2] : 0.5 * (v[n / 2 - 1] + v[n / 2]);
}

/// Wall time [s].
template <class Work>
double seconds(Work&& work) {
    const auto start = std::chrono::steady_clock::now();
    work();
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
}

template <class Work>
double clock_seconds(clockid_t clock, Work&& work) {
    const auto now = [clock] {
        timespec t{};
        clock_gettime(clock, &t);
        return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
    };
    const double start = now();
    work();
    return now() - start;
}

/// Time [s] that this thread, or all threads of this process, ran: what others run on the same
/// cores does not count.
template <class Work>
double thread_seconds(Work&& work) {
    return clock_seconds(CLOCK_THREAD_CPUTIME_ID, work);
}
template <class Work>
double process_seconds(Work&& work) {
    return clock_seconds(CLOCK_PROCESS_CPUTIME_ID, work);
}

struct Comparison {
    double ours = 0;   ///< median time [s]
    double theirs = 0; ///< median time [s]
    double ratio = 0;  ///< median of theirs / ours, pair by pair; above 1 we are faster
};

/// For work on one thread. One unmeasured pair first, then `repeats` measured pairs.
template <class Ours, class Theirs>
Comparison compare(int repeats, Ours ours, Theirs theirs) {
    ours();
    theirs();
    std::vector<double> a, b, ratio;
    for (int n = 0; n < repeats; ++n) {
        a.push_back(thread_seconds(ours));
        b.push_back(thread_seconds(theirs));
        ratio.push_back(b.back() / a.back());
    }
    return {median(a), median(b), median(ratio)};
}

} // namespace rille::bench
