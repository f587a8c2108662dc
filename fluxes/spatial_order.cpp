// SPDX-License-Identifier: Apache-2.0
#include "fluxes/spatial_order.hpp"

#include <algorithm>
#include <cstdint>
#include <numeric>

namespace rille::fluxes {
namespace {

constexpr int digits = 20; // of each coordinate

/// Moves bit i to bit 3 i.
std::uint64_t spread(std::uint64_t v) {
    v &= (std::uint64_t(1) << digits) - 1;
    v = (v | (v << 32)) & 0x001f00000000ffffULL;
    v = (v | (v << 16)) & 0x001f0000ff0000ffULL;
    v = (v | (v << 8)) & 0x100f00f00f00f00fULL;
    v = (v | (v << 4)) & 0x10c30c30c30c30c3ULL;
    return (v | (v << 2)) & 0x1249249249249249ULL;
}

} // namespace

std::vector<int> spatial_order(const geometry::Surface& surface) {
    std::vector<int> order(surface.size());
    std::iota(order.begin(), order.end(), 0);
    if (surface.size() == 0 || surface.corners[0][2] < 0) return order;
    geometry::Vec3 low = surface.centre[0], high = low;
    for (const geometry::Vec3& c : surface.centre)
        for (int axis = 0; axis < 3; ++axis) {
            low[axis] = std::min(low[axis], c[axis]);
            high[axis] = std::max(high[axis], c[axis]);
        }
    const geometry::Vec3 size = high - low;
    const double scale = ((1 << digits) - 1) / std::max({size.x, size.y, size.z, 1e-300});
    std::vector<std::uint64_t> key;
    for (const geometry::Vec3& c : surface.centre) {
        const geometry::Vec3 at = (c - low) * scale;
        key.push_back(spread(std::uint64_t(at.x)) | spread(std::uint64_t(at.y)) << 1 |
                      spread(std::uint64_t(at.z)) << 2);
    }
    std::stable_sort(order.begin(), order.end(), [&](int a, int b) { return key[a] < key[b]; });
    return order;
}

} // namespace rille::fluxes
