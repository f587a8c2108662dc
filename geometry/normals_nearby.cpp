// SPDX-License-Identifier: Apache-2.0
#include "geometry/normals_nearby.hpp"

#include "geometry/check.hpp"
#include "geometry/element_bins.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

std::vector<NormalRange> normals_nearby(const Domain& domain, const Surface& surface,
                                        double radius) {
    RILLE_CHECK(domain.planar_contour(), "normals of a contour");
    constexpr double pi = 3.14159265358979323846;
    const std::size_t count = surface.size();
    std::vector<double> psi(count);
    for (std::size_t e = 0; e < count; ++e)
        psi[e] = std::atan2(surface.normal[e].x, surface.normal[e].z);
    const ElementBins bins(surface.centre, radius, 0, 0);
    std::vector<NormalRange> range(count, {-pi, pi});
    over_ranges(count, 64, [&](std::size_t begin, std::size_t end) {
        for (std::size_t e = begin; e < end; ++e) {
            const Vec3& centre = surface.centre[e];
            if (centre.x - domain.x_min() < radius || domain.x_max() - centre.x < radius) continue;
            double low = psi[e], high = psi[e];
            bins.near(centre, radius, [&](int n, const Vec3&) {
                const double turned = psi[e] + std::remainder(psi[n] - psi[e], 2 * pi);
                low = std::min(low, turned);
                high = std::max(high, turned);
            });
            if (low >= -pi && high <= pi) range[e] = {low, high};
        }
    });
    return range;
}

} // namespace rille::geometry
