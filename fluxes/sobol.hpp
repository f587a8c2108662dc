// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <cstdint>

namespace rille::fluxes {

/// Well-mixed hash of 64 bits (finaliser of the SplitMix64 generator, Steele, Lea, Flood 2014).
inline std::uint64_t mixed(std::uint64_t x) {
    x += 0x9e3779b97f4a7c15ULL;
    x = (x ^ (x >> 30)) * 0xbf58476d1ce4e5b9ULL;
    x = (x ^ (x >> 27)) * 0x94d049bb133111ebULL;
    return x ^ (x >> 31);
}
inline std::uint64_t mixed(std::uint64_t a, std::uint64_t b) { return mixed(mixed(a) ^ b); }

/// Counter-based uniform number in [0, 1).
inline double uniform(std::uint64_t key, std::uint64_t counter) {
    return static_cast<double>(mixed(key, counter) >> 11) * 0x1p-53;
}

/// Point `index` of the Sobol sequence in six dimensions, digitally shifted by a key: every key
/// gives an unbiased, equally well spread point set. Direction numbers: Joe & Kuo, SIAM J. Sci.
/// Comput. 30, 2635 (2008) [from memory; the tests check the stratification].
class Sobol {
  public:
    static constexpr int dimensions = 6;

    explicit Sobol(std::uint64_t key) {
        for (int d = 0; d < dimensions; ++d)
            shift_[d] = static_cast<std::uint32_t>(mixed(key, d) >> 32);
    }

    double operator()(std::uint32_t index, int dimension) const {
        static const Directions directions;
        std::uint32_t x = shift_[dimension];
        for (int bit = 0; index != 0; index >>= 1, ++bit)
            if (index & 1u) x ^= directions.v[dimension][bit];
        return (x + 0.5) * 0x1p-32;
    }

  private:
    struct Directions {
        std::array<std::array<std::uint32_t, 32>, dimensions> v{};
        Directions() {
            struct Polynomial {
                int degree;
                std::uint32_t coefficients;
                std::array<std::uint32_t, 4> m;
            };
            constexpr std::array<Polynomial, dimensions - 1> polynomials = {{
                {1, 0, {1, 0, 0, 0}},
                {2, 1, {1, 3, 0, 0}},
                {3, 1, {1, 3, 1, 0}},
                {3, 2, {1, 1, 1, 0}},
                {4, 1, {1, 1, 3, 3}},
            }};
            for (int i = 0; i < 32; ++i) v[0][i] = 1u << (31 - i);
            for (int d = 1; d < dimensions; ++d) {
                const Polynomial& p = polynomials[d - 1];
                for (int i = 0; i < 32; ++i) {
                    if (i < p.degree) {
                        v[d][i] = p.m[i] << (31 - i);
                        continue;
                    }
                    std::uint32_t x = v[d][i - p.degree];
                    x ^= x >> p.degree;
                    for (int k = 1; k < p.degree; ++k)
                        if ((p.coefficients >> (p.degree - 1 - k)) & 1u) x ^= v[d][i - k];
                    v[d][i] = x;
                }
            }
        }
    };
    std::array<std::uint32_t, dimensions> shift_{};
};

} // namespace rille::fluxes
