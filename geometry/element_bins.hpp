// SPDX-License-Identifier: Apache-2.0
// Private to geometry: points sorted into bins, to find those near a place.
#pragma once

#include "geometry/vec.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <vector>

namespace rille::geometry {

/// Width 0 along x or y: not periodic there.
class ElementBins {
public:
    ElementBins(const std::vector<Vec3>& points, double size, double period_x, double period_y)
        : points_(points), period_{period_x, period_y, 0} {
        low_ = Vec3(std::numeric_limits<double>::max());
        Vec3 high(-std::numeric_limits<double>::max());
        for (const Vec3& p : points)
            for (int a = 0; a < 3; ++a) {
                low_[a] = std::min(low_[a], p[a]);
                high[a] = std::max(high[a], p[a]);
            }
        if (points.empty()) low_ = high = Vec3(0, 0, 0);
        for (;; size *= 1.5) {
            double total = 1;
            for (int a = 0; a < 3; ++a) {
                const double extent = period_[a] > 0 ? period_[a] : high[a] - low_[a];
                count_[a] = period_[a] > 0 ? std::max(1, static_cast<int>(extent / size))
                                           : static_cast<int>(extent / size) + 1;
                size_[a] = period_[a] > 0 ? extent / count_[a] : size;
                total *= count_[a];
            }
            if (total < 8e6) break;
        }
        start_.assign(static_cast<std::size_t>(count_[0]) * count_[1] * count_[2] + 1, 0);
        std::vector<int> bin(points.size());
        for (std::size_t n = 0; n < points.size(); ++n) {
            bin[n] =
                index(coordinate(points[n], 0), coordinate(points[n], 1), coordinate(points[n], 2));
            ++start_[bin[n] + 1];
        }
        for (std::size_t b = 1; b < start_.size(); ++b)
            start_[b] += start_[b - 1];
        std::vector<int> fill(start_.begin(), start_.end() - 1);
        order_.resize(points.size());
        for (std::size_t n = 0; n < points.size(); ++n)
            order_[fill[bin[n]]++] = static_cast<int>(n);
    }

    /// b - a through the nearest image.
    Vec3 between(const Vec3& a, const Vec3& b) const {
        Vec3 d = b - a;
        for (int axis = 0; axis < 2; ++axis)
            if (period_[axis] > 0) d[axis] -= period_[axis] * std::round(d[axis] / period_[axis]);
        return d;
    }

    /// visit(n, displacement) for every point within `radius` of p, in a fixed order.
    template <class Visit>
    void near(const Vec3& p, double radius, const Visit& visit) const {
        std::array<int, 3> from, to;
        for (int a = 0; a < 3; ++a) {
            from[a] = cell(p[a] - radius, a);
            to[a] = cell(p[a] + radius, a);
            if (period_[a] > 0) {
                to[a] = std::min(to[a], from[a] + count_[a] - 1);
            } else {
                from[a] = std::clamp(from[a], 0, count_[a] - 1);
                to[a] = std::clamp(to[a], 0, count_[a] - 1);
            }
        }
        for (int z = from[2]; z <= to[2]; ++z)
            for (int y = from[1]; y <= to[1]; ++y)
                for (int x = from[0]; x <= to[0]; ++x) {
                    const int b = index(wrap(x, 0), wrap(y, 1), z);
                    for (int m = start_[b]; m < start_[b + 1]; ++m) {
                        const Vec3 d = between(p, points_[order_[m]]);
                        if (d.length2() <= radius * radius) visit(order_[m], d);
                    }
                }
    }

    /// Nearest point, the lower index of two; -1 if there is none.
    int nearest(const Vec3& p) const {
        int best = -1;
        if (points_.empty()) return best;
        double best2 = std::numeric_limits<double>::max();
        for (double radius = std::max({size_[0], size_[1], size_[2]}); best < 0; radius *= 2)
            near(p, radius, [&](int n, const Vec3& d) {
                if (d.length2() < best2 || (d.length2() == best2 && n < best)) {
                    best2 = d.length2();
                    best = n;
                }
            });
        return best;
    }

private:
    int cell(double v, int a) const {
        return static_cast<int>(std::floor(std::clamp((v - low_[a]) / size_[a], -1e8, 1e8)));
    }
    int wrap(int c, int a) const {
        return period_[a] > 0 ? ((c % count_[a]) + count_[a]) % count_[a] : c;
    }
    int coordinate(const Vec3& p, int a) const {
        const int c = cell(p[a], a);
        return period_[a] > 0 ? wrap(c, a) : std::clamp(c, 0, count_[a] - 1);
    }
    int index(int x, int y, int z) const { return (z * count_[1] + y) * count_[0] + x; }

    const std::vector<Vec3>& points_;
    double period_[3];
    Vec3 low_;
    int count_[3];
    double size_[3];
    std::vector<int> start_, order_;
};

} // namespace rille::geometry
