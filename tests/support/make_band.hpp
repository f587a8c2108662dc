// SPDX-License-Identifier: Apache-2.0
// A narrow band filled from an analytic signed distance: no level-set library, no advance.
#pragma once

#include "geometry/band.hpp"

#include <cmath>
#include <functional>
#include <vector>

namespace rille::tests {

/// Every node with |distance| <= half_width cells between z_low and z_high [nm].
inline geometry::Band make_band(const geometry::Domain& domain,
                                const std::function<double(const geometry::Vec3&)>& distance,
                                double z_low, double z_high, double half_width = 4) {
    geometry::Band band;
    band.domain = domain;
    const double h = domain.spacing;
    const int nx = domain.cells_x, ny = domain.cells_y;
    const int k_low = static_cast<int>(std::floor(z_low / h - half_width)) - 1;
    const int k_high = static_cast<int>(std::ceil(z_high / h + half_width)) + 1;
    const int nz = k_high - k_low + 1;
    std::vector<int> index(static_cast<std::size_t>(nx) * ny * nz, -1);
    const auto slot = [&](int i, int j, int k) -> int& {
        return index[(static_cast<std::size_t>(k - k_low) * ny + j) * nx + i];
    };
    for (int k = k_low; k <= k_high; ++k)
        for (int j = 0; j < ny; ++j)
            for (int i = 0; i < nx; ++i) {
                const double phi = distance(domain.node(i, j, k));
                if (std::fabs(phi) > half_width * h) continue;
                slot(i, j, k) = static_cast<int>(band.size());
                band.cells.push_back({i, j, k});
                band.phi.push_back(phi);
            }
    const bool mirror = domain.sides == geometry::Sides::mirror;
    const auto beyond = [&](int i, int n) {
        if (i >= 0 && i < n) return i;
        return mirror ? (i < 0 ? 0 : n - 1) : (i + n) % n;
    };
    for (const auto& c : band.cells) {
        const auto at = [&](int i, int j, int k) {
            return k < k_low || k > k_high ? -1 : slot(beyond(i, nx), beyond(j, ny), k);
        };
        const bool flat = domain.extruded();
        band.neighbour.push_back(
            {at(c.i - 1, c.j, c.k), at(c.i + 1, c.j, c.k), flat ? -1 : at(c.i, c.j - 1, c.k),
             flat ? -1 : at(c.i, c.j + 1, c.k), at(c.i, c.j, c.k - 1), at(c.i, c.j, c.k + 1)});
    }
    return band;
}

} // namespace rille::tests
