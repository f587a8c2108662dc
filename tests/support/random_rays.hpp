// SPDX-License-Identifier: Apache-2.0
// Counter-based random numbers and cosine-law directions for tests: the same on every machine.
#pragma once

#include "geometry/vec.hpp"

#include <cmath>
#include <cstdint>

namespace rille::tests {

/// Uniform in [0, 1): the `index`-th number of stream `seed` (SplitMix64 finaliser, Steele, Lea and
/// Flood 2014).
inline double uniform(std::uint64_t seed, std::uint64_t index) {
    std::uint64_t z = seed * 0x9e3779b97f4a7c15ull + index * 0xbf58476d1ce4e5b9ull;
    for (int round = 0; round < 2; ++round) {
        z += 0x9e3779b97f4a7c15ull;
        z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9ull;
        z = (z ^ (z >> 27)) * 0x94d049bb133111ebull;
        z ^= z >> 31;
    }
    return static_cast<double>(z >> 11) * 0x1p-53;
}

/// Direction by the cosine law about unit `n` from two numbers in [0, 1).
inline geometry::Vec3 cosine_direction(const geometry::Vec3& n, double u1, double u2) {
    const geometry::Vec3 helper =
        std::fabs(n.x) < 0.5 ? geometry::Vec3(1, 0, 0) : geometry::Vec3(0, 1, 0);
    const geometry::Vec3 s = n.cross(helper).normalized(), t = n.cross(s);
    const double r = std::sqrt(u1), a = 2 * 3.14159265358979323846 * u2;
    return (r * std::cos(a) * s + r * std::sin(a) * t + std::sqrt(1 - u1) * n).normalized();
}

} // namespace rille::tests
