// SPDX-License-Identifier: Apache-2.0
// Properties that every extracted surface must have; each returns the largest violation.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <algorithm>
#include <cmath>
#include <functional>
#include <map>
#include <utility>
#include <vector>

namespace rille::tests {

using geometry::Domain;
using geometry::Surface;
using geometry::Vec3;

/// |sum(area * normal.z) / base - 1|, base the area of the period (its width in extruded).
inline double projected_area_fault(const Surface& s, const Domain& d) {
    double sum = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        sum += s.area[e] * s.normal[e].z;
    const double base = d.width_x() * (d.extruded() ? 1.0 : d.width_y());
    return std::fabs(sum / base - 1);
}

/// Whether next, previous, chain and shared corners of an extruded surface agree.
inline bool consistent_chains(const Surface& s, const Domain& d) {
    const int n = static_cast<int>(s.size());
    if (static_cast<int>(s.next.size()) != n || static_cast<int>(s.previous.size()) != n)
        return false;
    const double half = 0.5 * d.width_x();
    const bool mirror = d.sides == geometry::Sides::mirror;
    for (int e = 0; e < n; ++e) {
        const Vec3 end = s.vertices[s.corners[e][1]], start = s.vertices[s.corners[e][0]];
        if (std::fabs(end.x) > half || std::fabs(start.x) > half) return false;
        const int f = s.next[e];
        if (f < 0) {
            if (!mirror || std::fabs(end.x) != half) return false;
        } else {
            if (s.previous[f] != e || s.chain[f] != s.chain[e]) return false;
            const Vec3 begin = s.vertices[s.corners[f][0]];
            if (begin != end) { // only across a periodic side
                if (mirror || std::fabs(end.x) != half || begin.x != -end.x || begin.z != end.z)
                    return false;
            } else if (s.corners[f][0] != s.corners[e][1]) {
                return false;
            }
        }
        if (s.previous[e] < 0 && (!mirror || std::fabs(start.x) != half)) return false;
    }
    return true;
}

inline double largest_distance(const Surface& s,
                               const std::function<double(const Vec3&)>& distance) {
    double worst = 0;
    for (const Vec3& p : s.vertices)
        worst = std::max(worst, std::fabs(distance(p)));
    return worst;
}

inline double total_area(const Surface& s) {
    double sum = 0;
    for (double a : s.area)
        sum += a;
    return sum;
}

/// Edges of a full surface that are not shared by exactly two quads in opposite directions. Edges
/// on mirror sides may be free; at periodic sides an edge continues in the image of its vertices.
inline int loose_edges(const Surface& s, const Domain& d) {
    const double wx = d.width_x(), wy = d.width_y(), fine = 1e-9 * d.spacing;
    const bool mirror = d.sides == geometry::Sides::mirror;
    // Vertices at the same place (up to periods) are one.
    std::map<std::array<long long, 3>, int> place;
    std::vector<int> name(s.vertices.size());
    for (std::size_t v = 0; v < s.vertices.size(); ++v) {
        Vec3 p = s.vertices[v];
        if (!mirror) {
            p.x -= wx * std::floor(p.x / wx + 0.5 - 1e-7);
            p.y -= wy * std::floor(p.y / wy + 0.5 - 1e-7);
        }
        const std::array<long long, 3> key{std::llround(p.x / fine / 64),
                                           std::llround(p.y / fine / 64),
                                           std::llround(p.z / fine / 64)};
        name[v] = place.emplace(key, static_cast<int>(v)).first->second;
    }
    std::map<std::pair<int, int>, std::pair<int, int>> count; // forwards, backwards
    for (const auto& c : s.corners)
        for (int m = 0; m < 4; ++m) {
            const int a = name[c[m]], b = name[c[(m + 1) % 4]];
            if (a == b) continue;
            (a < b ? count[{a, b}].first : count[{b, a}].second) += 1;
        }
    int loose = 0;
    for (const auto& [edge, uses] : count) {
        if (uses.first == 1 && uses.second == 1) continue;
        const Vec3 a = s.vertices[edge.first], b = s.vertices[edge.second];
        const bool on_x =
            std::fabs(std::fabs(a.x) - wx / 2) + std::fabs(std::fabs(b.x) - wx / 2) == 0;
        const bool on_y =
            std::fabs(std::fabs(a.y) - wy / 2) + std::fabs(std::fabs(b.y) - wy / 2) == 0;
        if (mirror && uses.first + uses.second == 1 && (on_x || on_y)) continue;
        ++loose;
    }
    return loose;
}

} // namespace rille::tests
