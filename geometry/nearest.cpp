// SPDX-License-Identifier: Apache-2.0
#include "geometry/nearest.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

namespace rille::geometry {
namespace {

int wrapped(int i, int n, Sides sides) {
    if (sides == Sides::periodic) return ((i % n) + n) % n;
    const int m = ((i % (2 * n)) + 2 * n) % (2 * n);
    return m < n ? m : 2 * n - 1 - m;
}

/// Smallest separation along one axis, counting images beyond the sides.
double separation(double a, double b, double low, double width, Sides sides) {
    double d = std::fabs(a - b);
    if (sides == Sides::periodic) return std::min(d, std::fabs(width - d));
    const double mirrored_low = std::fabs(2 * low - a - b);
    const double mirrored_high = std::fabs(2 * (low + width) - a - b);
    return std::min({d, mirrored_low, mirrored_high});
}

} // namespace

NearestElement::NearestElement(const Domain& domain, const Surface& surface)
    : domain_(domain), surface_(surface), size_(2 * domain.spacing) {
    double z_low = std::numeric_limits<double>::infinity(), z_high = -z_low;
    for (const Vec3& c : surface.centre) {
        z_low = std::min(z_low, c.z);
        z_high = std::max(z_high, c.z);
    }
    z_low_ = z_low;
    nx_ = std::max(1, static_cast<int>(std::ceil(domain.width_x() / size_)));
    ny_ = domain.planar_contour()
              ? 1
              : std::max(1, static_cast<int>(std::ceil(domain.width_y() / size_)));
    nz_ = surface.size() == 0 ? 1 : static_cast<int>((z_high - z_low) / size_) + 1;
    std::vector<long> cell(surface.size());
    first_.assign(static_cast<std::size_t>(nx_) * ny_ * nz_ + 1, 0);
    for (std::size_t e = 0; e < surface.size(); ++e) {
        const Vec3& c = surface.centre[e];
        const int i = std::clamp(static_cast<int>((c.x - domain.x_min()) / size_), 0, nx_ - 1);
        const int j = std::clamp(static_cast<int>((c.y - domain.y_min()) / size_), 0, ny_ - 1);
        const int k = std::clamp(static_cast<int>((c.z - z_low_) / size_), 0, nz_ - 1);
        cell[e] = cell_of(i, j, k);
        ++first_[cell[e] + 1];
    }
    std::partial_sum(first_.begin(), first_.end(), first_.begin());
    elements_.resize(surface.size());
    std::vector<int> next(first_.begin(), first_.end() - 1);
    for (std::size_t e = 0; e < surface.size(); ++e)
        elements_[next[cell[e]]++] = static_cast<int>(e);
}

long NearestElement::cell_of(int i, int j, int k) const {
    return (static_cast<long>(k) * ny_ + j) * nx_ + i;
}

int NearestElement::operator()(const Vec3& p) const {
    const int i0 = static_cast<int>(std::floor((p.x - domain_.x_min()) / size_));
    const int j0 = domain_.planar_contour()
                       ? 0
                       : static_cast<int>(std::floor((p.y - domain_.y_min()) / size_));
    const int k0 = static_cast<int>(std::floor((p.z - z_low_) / size_));
    const int widest = nx_ + ny_ + nz_ + std::abs(k0);
    int best = -1;
    double best2 = std::numeric_limits<double>::infinity();
    const auto look_in = [&](int i, int j, int k) {
        if (k < 0 || k >= nz_) return;
        const long cell =
            cell_of(wrapped(i, nx_, domain_.sides), wrapped(j, ny_, domain_.sides), k);
        for (int n = first_[cell]; n < first_[cell + 1]; ++n) {
            const Vec3& c = surface_.centre[elements_[n]];
            const double dx =
                separation(p.x, c.x, domain_.x_min(), domain_.width_x(), domain_.sides);
            const double dy =
                domain_.planar_contour()
                    ? 0.0
                    : separation(p.y, c.y, domain_.y_min(), domain_.width_y(), domain_.sides);
            const double d2 = dx * dx + dy * dy + (p.z - c.z) * (p.z - c.z);
            if (d2 < best2 || (d2 == best2 && elements_[n] < best)) {
                best2 = d2;
                best = elements_[n];
            }
        }
    };
    for (int ring = 0; ring <= widest; ++ring) {
        if (best >= 0 && best2 <= (ring - 1) * size_ * (ring - 1) * size_) break;
        const int dj = domain_.planar_contour() ? 0 : ring;
        for (int k = k0 - ring; k <= k0 + ring; ++k)
            for (int j = j0 - dj; j <= j0 + dj; ++j)
                for (int i = i0 - ring; i <= i0 + ring; ++i)
                    if (std::max({std::abs(i - i0), std::abs(j - j0), std::abs(k - k0)}) == ring)
                        look_in(i, j, k);
    }
    return best;
}

} // namespace rille::geometry
