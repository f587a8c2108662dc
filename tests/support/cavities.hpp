// SPDX-License-Identifier: Apache-2.0
// Extruded cavities of many kinds, by hand.
#pragma once

#include "tests/support/shapes.hpp"

#include <cmath>
#include <string>
#include <vector>

namespace rille::tests {

struct Cavity {
    std::string name;
    Domain domain;
    Surface surface;
};

inline Cavity make_cavity(const char* name, geometry::Sides sides, const std::vector<Vec3>& points,
                          double length = 1) {
    Domain d;
    d.sides = sides;
    d.cells_x = static_cast<int>(points.back().x - points.front().x + 0.5);
    return {name, d, polyline(d, points, length)};
}

inline Cavity straight_trench(double depth = 40) {
    return make_cavity(
        "straight trench", geometry::Sides::mirror,
        {{-20, 0, 0}, {-10, 0, 0}, {-10, 0, -depth}, {10, 0, -depth}, {10, 0, 0}, {20, 0, 0}});
}

/// Narrow mask, wide belly.
inline Cavity bowed_trench() {
    return make_cavity("bowed trench", geometry::Sides::periodic,
                       {{-20, 0, 0},
                        {-8, 0, 0},
                        {-8, 0, -8},
                        {-15, 0, -20},
                        {-13, 0, -35},
                        {-6, 0, -45},
                        {7, 0, -44},
                        {14, 0, -33},
                        {14, 0, -18},
                        {8, 0, -8},
                        {8, 0, 0},
                        {20, 0, 0}});
}

/// A bottle: neck of 6 in a cavity of 30.
inline Cavity necked_trench() {
    return make_cavity("necked trench", geometry::Sides::mirror,
                       {{-20, 0, 0},
                        {-6, 0, 0},
                        {-3, 0, -6},
                        {-12, 0, -8},
                        {-15, 0, -14},
                        {-15, 0, -30},
                        {15, 0, -30},
                        {15, 0, -8},
                        {3, 0, -6},
                        {6, 0, 0},
                        {20, 0, 0}});
}

/// Scallops down both walls, hooks under the mask.
inline Cavity scalloped_trench() {
    std::vector<Vec3> left{{-20, 0, 0}, {-7, 0, 0}, {-7, 0, -4}, {-10, 0, -2}};
    const double pi = 3.14159265358979323846;
    for (int s = 0; s < 5; ++s)
        for (int i = 0; i <= 8; ++i)
            left.push_back({-10 - 3 * std::sin(pi * i / 8), 0, -5 - 6 * (s + i / 8.0)});
    std::vector<Vec3> points;
    for (std::size_t i = 0; i < left.size(); ++i)
        if (i == 0 || (left[i] - left[i - 1]).length() > 1e-9) points.push_back(left[i]);
    for (std::size_t i = points.size(); i-- > 0;)
        points.push_back({-points[i].x, 0, points[i].z});
    return make_cavity("scalloped trench", geometry::Sides::mirror, points);
}

/// Ridges of different heights about the mirror sides, so that images see each other.
inline Cavity ridges() {
    return make_cavity("ridges", geometry::Sides::mirror,
                       {{-20, 0, -12},
                        {-12, 0, -14},
                        {-9, 0, 0},
                        {-4, 0, 0},
                        {-5, 0, -20},
                        {5, 0, -22},
                        {6, 0, -5},
                        {11, 0, -5},
                        {12, 0, -16},
                        {20, 0, -15}});
}

/// The same over a periodic side.
inline Cavity sawtooth() {
    return make_cavity(
        "sawtooth", geometry::Sides::periodic,
        {{-20, 0, -6}, {-12, 0, -14}, {-5, 0, 2}, {3, 0, -25}, {9, 0, -1}, {20, 0, -6}});
}

inline std::vector<Cavity> all_cavities() {
    return {straight_trench(),  bowed_trench(), necked_trench(),
            scalloped_trench(), ridges(),       sawtooth()};
}

} // namespace rille::tests
