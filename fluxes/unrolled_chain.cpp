// SPDX-License-Identifier: Apache-2.0
#include "fluxes/unrolled_chain.hpp"

#include "geometry/check.hpp"

#include <cmath>

namespace rille::fluxes {
namespace {

/// Elements of chain 0 in walking order, from a mirror side or from anywhere.
std::vector<int> open_elements(const geometry::Surface& surface, bool mirror) {
    int first = -1;
    const int count = static_cast<int>(surface.size());
    for (int e = 0; e < count && first < 0; ++e)
        if (surface.chain[e] == 0 && (!mirror || surface.previous[e] < 0)) first = e;
    RILLE_CHECK(first >= 0, "no part of the surface is open to the source");
    std::vector<int> order;
    for (int e = first; e >= 0; e = surface.next[e]) {
        if (!order.empty() && e == first) break;
        RILLE_CHECK(static_cast<int>(order.size()) < count, "the open surface never closes");
        order.push_back(e);
    }
    return order;
}

} // namespace

UnrolledChain unroll(const geometry::Domain& domain, const geometry::Surface& surface) {
    const double period = domain.width_x();
    const bool mirror = domain.sides == geometry::Sides::mirror;
    const std::vector<int> order = open_elements(surface, mirror);
    const int n = static_cast<int>(order.size());
    std::vector<PlanePoint> base;
    for (int e : order) {
        const geometry::Vec3 a = surface.vertices[surface.corners[e][0]];
        const geometry::Vec3 b = surface.vertices[surface.corners[e][1]];
        double from = a.x, to = b.x;
        if (!mirror) {
            if (!base.empty()) from += period * std::round((base.back().x - from) / period);
            to += period * std::round((from - to) / period);
        }
        if (base.empty()) base.push_back({from, a.z});
        base.push_back({to, b.z});
    }
    RILLE_CHECK(std::fabs(base.back().x - base.front().x - period) < 1e-6 * period,
                "the open surface does not span the period");
    int top = 0;
    for (int i = 1; i < n; ++i)
        if (base[i].z > base[top].z) top = i;
    if (mirror && base[n].z > base[top].z) top = n;
    const auto image = [&](int j) {
        const int m = j / n, r = j - m * n;
        if (!mirror || m % 2 == 0) return PlanePoint{base[r].x + m * period, base[r].z};
        return PlanePoint{2 * (domain.x_min() + period) + (m - 1) * period - base[n - r].x,
                          base[n - r].z};
    };
    UnrolledChain chain;
    const int total = mirror ? 2 * n : n;
    for (int j = top; j <= top + total; ++j)
        chain.point.push_back(image(j));
    chain.position.assign(surface.size(), -1);
    for (int j = top; j < top + total; ++j) {
        const int m = j / n, r = j - m * n;
        const bool reflected = mirror && m % 2 != 0;
        chain.element.push_back(order[reflected ? n - 1 - r : r]);
        chain.image.push_back(reflected);
        if (!reflected) chain.position[chain.element.back()] = j - top;
    }
    return chain;
}

} // namespace rille::fluxes
