// SPDX-License-Identifier: Apache-2.0
// Moves a front under rates that a test states as a function of element and normal.
#pragma once

#include "geometry/band.hpp"
#include "geometry/front.hpp"

#include <cmath>
#include <functional>
#include <limits>
#include <vector>

namespace rille::tests {

using geometry::Domain;
using geometry::Front;
using geometry::Sides;
using geometry::Surface;
using geometry::Symmetry;
using geometry::Vec3;

constexpr double pi = 3.14159265358979323846;

inline Domain make_domain(Symmetry symmetry, Sides sides, double spacing, int nx, int ny = 1) {
    Domain d;
    d.symmetry = symmetry;
    d.sides = sides;
    d.spacing = spacing;
    d.cells_x = nx;
    d.cells_y = ny;
    return d;
}

inline geometry::Stack one_film(int material = 0) {
    return geometry::Stack({{"bulk", material, 0, -std::numeric_limits<double>::infinity()}});
}

/// Mask (material 1) on [0, thickness], film (material 0) below.
inline geometry::Stack masked(double thickness) {
    return geometry::Stack(
        {{"mask", 1, thickness, 0}, {"film", 0, 0, -std::numeric_limits<double>::infinity()}});
}

inline std::vector<double> even_angles(double low, double high, int count) {
    std::vector<double> out;
    for (int a = 0; a <= count; ++a)
        out.push_back(low + (high - low) * a / count);
    return out;
}

/// rate(element, material, angle); rows for materials 0 .. materials - 1 on every element.
using RateLaw = std::function<double(const Surface&, int, int, double)>;

inline geometry::NormalRates make_rates(const Surface& s, const std::vector<double>& angles,
                                        int materials, const RateLaw& law) {
    geometry::NormalRates r;
    r.angles = angles;
    r.first_row.push_back(0);
    for (int e = 0; e < static_cast<int>(s.size()); ++e) {
        for (int m = 0; m < materials; ++m) {
            r.material.push_back(m);
            for (const double a : angles)
                r.table.push_back(law(s, e, m, a));
        }
        r.first_row.push_back(static_cast<int>(r.material.size()));
    }
    return r;
}

struct Loop {
    geometry::Stack stack = one_film();
    std::vector<double> angles = {-pi, pi};
    int materials = 1;
    RateLaw law = [](const Surface&, int, int, double) { return 1.0; };
    double max_move = 0.5; ///< [cells]
    double max_share = 0.45;
};

struct LoopResult {
    int calls = 0, sub_steps = 0;
    double shift = 0; ///< [cells] summed over the calls
    double time = 0;
};

/// Moves the front for `time`, arrivals refreshed every max_move cells.
inline LoopResult etch(Front& front, const Loop& loop, double time) {
    LoopResult out;
    while (out.time < time * (1 - 1e-12)) {
        const Surface s = extract_surface(front);
        const auto rates = make_rates(s, loop.angles, loop.materials, loop.law);
        // Growth is recorded in a film of material 0 that the next call takes as part of the stack.
        geometry::GrownFilms films;
        films.material = {0};
        films.thickness = {std::vector<double>(s.size(), 0.0)};
        const std::vector<int> growth(s.size(), 0);
        geometry::AdvanceLimits limits;
        limits.time = time - out.time;
        limits.max_move = loop.max_move;
        limits.max_share = loop.max_share;
        const auto report = advance(front, s, rates, loop.stack, films, growth, -1e9, limits);
        ++out.calls;
        out.sub_steps += report.sub_steps;
        out.shift += report.redistance_shift;
        out.time += report.time;
        if (report.time == 0) break;
    }
    return out;
}

/// Largest |phi(x)| distance of the vertices of the front to an exact shape: how far it is off.
template <class Distance>
double worst_vertex(const Surface& s, const Distance& exact) {
    double most = 0;
    for (const Vec3& v : s.vertices)
        most = std::max(most, std::fabs(exact(v)));
    return most;
}

/// Mask of the given thickness on z <= 0 with an opening |x| < half: exact distance.
inline double mask_distance(const Vec3& p, double half, double thickness) {
    const double in = half - std::fabs(p.x); // > 0 inside the opening
    if (p.z > thickness) return in < 0 ? p.z - thickness : std::hypot(in, p.z - thickness);
    if (in >= 0 && p.z >= 0) return std::min(in, p.z);
    if (in < 0 && p.z >= 0) return -std::min(-in, thickness - p.z);
    return -std::min(in > 0 ? -p.z : std::hypot(in, p.z), thickness - p.z);
}

/// Area between the extruded front and the level z = 0, counted positive below [nm^2].
inline double area_below(const Surface& s) {
    double sum = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
        sum -= 0.5 * (a.z + b.z) * (b.x - a.x);
    }
    return sum;
}

} // namespace rille::tests
