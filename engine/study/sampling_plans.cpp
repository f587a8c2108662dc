// SPDX-License-Identifier: Apache-2.0
#include "engine/study/sampling_plans.hpp"

#include "fluxes/sampling.hpp"

#include <boost/random/sobol.hpp>

namespace rille::engine {

namespace {

/// A permutation of 0 .. count - 1: a Feistel network of four rounds on the next even number of
/// bits, walked until it lands inside. At most four times as many numbers as `count` are walked
/// over, so few steps are needed.
std::uint64_t permuted(std::uint64_t index, std::uint64_t count, std::uint64_t key) {
    int half = 1;
    while ((std::uint64_t(1) << (2 * half)) < count)
        ++half;
    const std::uint64_t mask = (std::uint64_t(1) << half) - 1;
    do {
        std::uint64_t left = index >> half, right = index & mask;
        for (std::uint64_t round = 0; round < 4; ++round) {
            const std::uint64_t next = left ^ (fluxes::stream_key(key, round, right) & mask);
            left = right;
            right = next;
        }
        index = left << half | right;
    } while (index >= count);
    return index;
}

} // namespace

std::vector<double> sobol_point(std::size_t dimensions, std::size_t index) {
    std::vector<double> point(dimensions, 0.0); // the library leaves the origin out
    if (dimensions == 0 || index == 0) return point;
    boost::random::sobol sequence(dimensions);
    sequence.seed(index - 1);
    for (double& x : point)
        x = fluxes::unit_interval(sequence());
    return point;
}

std::vector<double> latin_hypercube_point(std::size_t dimensions, std::size_t count,
                                          std::uint64_t seed, std::size_t index) {
    std::vector<double> point(dimensions);
    for (std::size_t d = 0; d < dimensions; ++d) {
        const std::uint64_t key = fluxes::stream_key(seed, d);
        const double within = fluxes::unit_interval(fluxes::stream_key(key, index, 1));
        point[d] = (static_cast<double>(permuted(index, count, key)) + within) /
                   static_cast<double>(count);
    }
    return point;
}

} // namespace rille::engine
