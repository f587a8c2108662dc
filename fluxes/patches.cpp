// SPDX-License-Identifier: Apache-2.0
#include "fluxes/patches.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::fluxes {
namespace {

using geometry::Surface;
using geometry::Vec3;

constexpr double corner_turn = 0.35; ///< [rad] between neighbours

double length_of(const Surface& s, int e) {
    return (s.vertices[s.corners[e][1]] - s.vertices[s.corners[e][0]]).length();
}

double turn_between(const Surface& s, int a, int b) {
    const Vec3 &m = s.normal[a], &n = s.normal[b];
    return std::atan2(m.x * n.z - m.z * n.x, m.x * n.x + m.z * n.z);
}

/// Weights by which the means of three cells give a parabola's value: columns of the inverse of
/// the matrix of the cells' moments.
std::array<double, 3> parabola(const std::array<std::array<double, 3>, 3>& moment, double s) {
    // Solves sum_k weight_k moment_k = (1, s, s^2) by Cramer's rule.
    const auto det = [](const std::array<double, 3>& a, const std::array<double, 3>& b,
                        const std::array<double, 3>& c) {
        return a[0] * (b[1] * c[2] - b[2] * c[1]) - a[1] * (b[0] * c[2] - b[2] * c[0]) +
               a[2] * (b[0] * c[1] - b[1] * c[0]);
    };
    const std::array<double, 3> at{1, s, s * s};
    const double whole = det(moment[0], moment[1], moment[2]);
    return {det(at, moment[1], moment[2]) / whole, det(moment[0], at, moment[2]) / whole,
            det(moment[0], moment[1], at) / whole};
}

} // namespace

Patches::Patches(const Surface& surface, const geometry::RayCaster& caster, std::vector<int> order,
                 const std::vector<int>& material, const std::vector<int>& ends,
                 const PatchSizes& sizes)
    : order_(std::move(order)), element_area_(surface.area) {
    const int n = static_cast<int>(order_.size());
    corner_.assign(n + 1, 0);
    corner_[0] = corner_[n] = 1;
    for (int k = 1; k < n; ++k)
        corner_[k] = std::fabs(turn_between(surface, order_[k - 1], order_[k])) > corner_turn;
    std::vector<char> breaks = corner_;
    for (int k = 1; k < n && !material.empty(); ++k)
        if (material[order_[k - 1]] != material[order_[k]]) breaks[k] = 1;
    for (const int k : ends)
        breaks[k] = 1;
    divide(surface, lengths_wanted(surface, caster, sizes), breaks, sizes);
}

/// Per element of the order: length of a patch there.
std::vector<double> Patches::lengths_wanted(const Surface& surface,
                                            const geometry::RayCaster& caster,
                                            const PatchSizes& sizes) const {
    const int n = static_cast<int>(order_.size());
    std::vector<Vec3> corners; // the ends of the chain are none: the sides mirror or repeat
    for (int k = 1; k < n; ++k)
        if (corner_[k]) corners.push_back(surface.vertices[surface.corners[order_[k]][0]]);
    std::vector<double> wanted(n, std::numeric_limits<double>::infinity());
    for (int k = 0; k < n; ++k) {
        const int e = order_[k];
        for (const Vec3& c : corners)
            wanted[k] = std::min(wanted[k], sizes.growth * (c - surface.centre[e]).length());
        const auto hit = caster.trace(surface.centre[e], surface.normal[e], e);
        if (hit.kind == geometry::Hit::Kind::surface)
            wanted[k] = std::min(wanted[k], sizes.gap_share * hit.distance);
        wanted[k] = std::max(wanted[k], length_of(surface, e));
    }
    for (int k = 1; k < n; ++k)
        wanted[k] =
            std::min(wanted[k], wanted[k - 1] + sizes.growth * length_of(surface, order_[k]));
    for (int k = n - 2; k >= 0; --k)
        wanted[k] =
            std::min(wanted[k], wanted[k + 1] + sizes.growth * length_of(surface, order_[k]));
    return wanted;
}

/// Between breaks, patches of equal shares of the integral of (1 / wanted length), ends moved to
/// the nearest vertex.
void Patches::divide(const Surface& surface, const std::vector<double>& wanted,
                     const std::vector<char>& breaks, const PatchSizes& sizes) {
    const int n = static_cast<int>(order_.size());
    first_.assign(1, 0);
    for (int from = 0; from < n;) {
        int to = from + 1;
        while (!breaks[to])
            ++to;
        std::vector<double> count(1, 0.0); // patches up to each vertex
        for (int k = from; k < to; ++k) {
            double share = length_of(surface, order_[k]) / wanted[k];
            if (k + 1 < to)
                share += std::fabs(turn_between(surface, order_[k], order_[k + 1])) / sizes.turn;
            count.push_back(count.back() + share);
        }
        const int pieces = static_cast<int>(
            std::clamp(std::round(count.back()), 1.0, static_cast<double>(to - from)));
        for (int p = 1; p <= pieces; ++p) {
            const double at = count.back() * p / pieces;
            const auto above = std::lower_bound(count.begin() + 1, count.end() - 1, at);
            int k = static_cast<int>(above - count.begin());
            if (k > 1 && at - count[k - 1] < count[k] - at) --k;
            if (p == pieces) k = to - from;
            if (from + k > first_.back()) first_.push_back(from + k);
        }
        from = to;
    }
    patch_.assign(surface.size(), -1);
    place_.assign(surface.size(), -1);
    for (std::size_t p = 0; p + 1 < first_.size(); ++p) {
        area_.push_back(0);
        for (int k = first_[p]; k < first_[p + 1]; ++k) {
            patch_[order_[k]] = static_cast<int>(p);
            place_[order_[k]] = k;
            area_.back() += surface.area[order_[k]];
        }
    }
}

void Patches::set_view(const Surface& surface, std::vector<double> share) {
    view_ = std::move(share);
    part_.assign(order_.size(), {});
    const int patches = static_cast<int>(size());
    for (int from = 0; from < patches;) {
        int to = from + 1; // patches of one smooth piece
        while (to < patches && !corner_[first_[to]])
            ++to;
        std::vector<double> place; // arc length of element centres
        double arc = 0;
        for (int k = first_[from]; k < first_[to]; ++k) {
            const double length = length_of(surface, order_[k]);
            place.push_back(arc + 0.5 * length);
            arc += length;
        }
        set_parts(from, to, place);
        from = to;
    }
}

/// For patches from ... to - 1, a smooth piece; `place` of their elements along it.
void Patches::set_parts(int from, int to, const std::vector<double>& place) {
    const double* at = place.data() - first_[from];
    for (int p = from; p < to; ++p) {
        const int used = std::min(3, to - from), low = std::clamp(p - 1, from, to - used);
        // Mean arrival of a patch = sum of coefficient x moment, moments weighted by the view.
        std::array<std::array<double, 3>, 3> moment{};
        bool sees = true;
        for (int c = 0; c < used; ++c) {
            for (int k = first_[low + c]; k < first_[low + c + 1]; ++k) {
                const double s = at[k] - at[first_[p]];
                const double weight = element_area_[order_[k]] * view_[order_[k]] / area_[low + c];
                moment[c][0] += weight, moment[c][1] += weight * s, moment[c][2] += weight * s * s;
            }
            sees = sees && moment[c][0] > 1e-12;
        }
        for (int k = first_[p]; k < first_[p + 1]; ++k) {
            const double s = at[k] - at[first_[p]];
            Part& part = part_[k];
            part.patch = low;
            if (!sees || used == 1) {
                const double own = moment[p - low][0];
                part.patch = p;
                part.weight = {own > 1e-12 ? 1 / own : 0.0, 0, 0};
            } else if (used == 2) {
                const auto &a = moment[0], &b = moment[1];
                const double det = a[0] * b[1] - a[1] * b[0];
                part.weight = {(b[1] - s * b[0]) / det, (s * a[0] - a[1]) / det, 0};
            } else {
                part.weight = parabola(moment, s);
            }
            for (double& w : part.weight)
                w *= view_[order_[k]];
        }
    }
}

void Patches::average(const double* element, double* patch) const {
    for (std::size_t p = 0; p < size(); ++p) {
        double sum = 0;
        for (int k = first_[p]; k < first_[p + 1]; ++k)
            sum += element_area_[order_[k]] * element[order_[k]];
        patch[p] = sum / area_[p];
    }
}

void Patches::spread(const double* patch, double* element) const {
    for (std::size_t k = 0; k < order_.size(); ++k) {
        const Part& part = part_[k];
        double value = part.weight[0] * patch[part.patch];
        for (int c = 1; c < 3; ++c)
            if (part.weight[c] != 0) value += part.weight[c] * patch[part.patch + c];
        element[order_[k]] += value;
    }
}

void Patches::project(const double* place, double* patch) const {
    std::fill(patch, patch + size(), 0.0);
    for (std::size_t k = 0; k < order_.size();) {
        const int at = part_[k].patch, last = std::min<int>(3, static_cast<int>(size()) - at);
        std::array<double, 3> sum{};
        for (; k < order_.size() && part_[k].patch == at; ++k)
            for (int c = 0; c < 3; ++c)
                sum[c] += part_[k].weight[c] * place[k];
        for (int c = 0; c < last; ++c)
            patch[at + c] += sum[c];
    }
}

} // namespace rille::fluxes
