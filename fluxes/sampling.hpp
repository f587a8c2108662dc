// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <cstdint>

namespace rille::fluxes {

/// One round of a 64-bit mixing function (two multiply-xorshift steps): every input bit reaches
/// every output bit.
constexpr std::uint64_t mix64(std::uint64_t x) {
    x += 0x9e3779b97f4a7c15ULL;
    x = (x ^ (x >> 32)) * 0xd6e8feb86659fd93ULL;
    x = (x ^ (x >> 29)) * 0xa0761d6478bd642fULL;
    return x ^ (x >> 32);
}

/// Key of an independent stream named by a tuple of counters, e.g. (seed, refresh, element, batch).
/// Streams need no state: any point of any stream can be had in any order by any thread.
template <typename... Counters>
constexpr std::uint64_t stream_key(std::uint64_t first, Counters... rest) {
    std::uint64_t key = mix64(first);
    ((key = mix64(key ^ (static_cast<std::uint64_t>(rest) * 0xff51afd7ed558ccdULL))), ...);
    return key;
}

/// Double in [0, 1) from the top 53 bits.
constexpr double unit_interval(std::uint64_t bits) {
    return static_cast<double>(bits >> 11) * (1.0 / 9007199254740992.0);
}

/// Low-discrepancy points of one stream: the first two dimensions of the base-2 digital sequence of
/// Sobol', scrambled by nested uniform (Owen) permutations of the digits. Higher dimensions come as
/// further pairs, each with its own scramble and its own nested permutation of the order of points,
/// so pairs are independent of each other. Any aligned block of 2^m points of a pair is a net:
/// one point in each of its elementary intervals of area 2^-m. Points of different streams are
/// independent, each point is uniform, so means over streams are unbiased and their spread is an
/// honest error. Resolution 2^-32.
/// Method: Owen (1995); permutations by hashing bits upwards, Laine & Karras (2011) [from memory].
class ScrambledPoints {
public:
    explicit ScrambledPoints(std::uint64_t key) : key_(key) {
        for (int pair = 0; pair < usual_pairs; ++pair)
            usual_[pair] = keys_of(pair);
    }

    /// Dimensions 2 * pair and 2 * pair + 1 of point `index`, each in [0, 1).
    std::array<double, 2> pair(std::uint32_t index, int pair) const {
        const Keys keys = pair < usual_pairs ? usual_[pair] : keys_of(pair);
        const std::uint32_t i =
            pair == 0 ? index : reverse(permute_upwards(reverse(index), keys.order));
        // Both dimensions hold the digits lowest first, as the permutation wants them.
        return {fraction(permute_upwards(i, keys.first)),
                fraction(permute_upwards(second_dimension(i), keys.second))};
    }
    /// Dimensions 0 to 3.
    std::array<double, 4> four(std::uint32_t index) const {
        const auto a = pair(index, 0), b = pair(index, 1);
        return {a[0], a[1], b[0], b[1]};
    }

private:
    /// Names of the permutations of a pair.
    struct Keys {
        std::uint64_t order = 0, first = 0, second = 0;
    };
    static constexpr int usual_pairs = 3; ///< found once; further ones at each point

    Keys keys_of(int pair) const {
        const std::uint64_t key = mix64(key_ + 0x632be59bd9b4e019ULL * (1 + std::uint64_t(pair)));
        return {mix64(key ^ 1), mix64(key ^ 2), mix64(key ^ 3)};
    }
    static std::uint32_t reverse(std::uint32_t v) {
        v = ((v >> 1) & 0x55555555u) | ((v & 0x55555555u) << 1);
        v = ((v >> 2) & 0x33333333u) | ((v & 0x33333333u) << 2);
        v = ((v >> 4) & 0x0f0f0f0fu) | ((v & 0x0f0f0f0fu) << 4);
        v = ((v >> 8) & 0x00ff00ffu) | ((v & 0x00ff00ffu) << 8);
        return (v >> 16) | (v << 16);
    }
    /// Digits, lowest first, of the dimension whose direction numbers follow from the primitive
    /// polynomial x + 1: v_1 = 2^31, v_k = v_(k-1) ^ (v_(k-1) >> 1). Then v_k holds the binomials
    /// (k-1 over j) mod 2, which are odd where the bits of j are among those of k - 1 (Lucas):
    /// digit j is the parity of the index bits k with j's bits among k's, summed up bit by bit of
    /// j.
    static std::uint32_t second_dimension(std::uint32_t index) {
        index ^= (index >> 1) & 0x55555555u;
        index ^= (index >> 2) & 0x33333333u;
        index ^= (index >> 4) & 0x0f0f0f0fu;
        index ^= (index >> 8) & 0x00ff00ffu;
        return index ^ (index >> 16);
    }
    /// A permutation in which each bit is changed by lower bits only. Adding a constant, adding an
    /// even multiple, and xor with an even multiple all keep that order.
    static std::uint32_t permute_upwards(std::uint32_t v, std::uint64_t key) {
        const auto low = static_cast<std::uint32_t>(key);
        const auto high = static_cast<std::uint32_t>(key >> 32);
        v += low;
        v ^= v * 0x6a09e668u;
        v *= high | 1u;
        v ^= v * 0xbb67ae86u;
        v += high ^ (low >> 7);
        v *= (low << 3) | 1u;
        v ^= v * 0x3c6ef372u;
        v ^= v * ((high << 1) & ~1u);
        return v + low;
    }
    static double fraction(std::uint32_t digits) { return reverse(digits) * (1.0 / 4294967296.0); }

    std::uint64_t key_;
    std::array<Keys, usual_pairs> usual_;
};

} // namespace rille::fluxes
