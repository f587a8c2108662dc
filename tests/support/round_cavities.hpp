// SPDX-License-Identifier: Apache-2.0
// Round cavities of many kinds, by hand.
#pragma once

#include "tests/support/revolved_shapes.hpp"

#include <cmath>
#include <string>
#include <vector>

namespace rille::tests {

struct RoundCavity {
    std::string name;
    Domain domain;
    Surface surface;
};

/// From points on the axis out to the rim, and a flat outside.
inline RoundCavity make_round(const char* name, std::vector<Vec3> points, double length = 1) {
    const Domain d = round_cell(24);
    points.push_back({24, 0, points.back().z});
    return {name, d, frusta(d, points, length)};
}

inline std::vector<RoundCavity> all_round_cavities() {
    const double pi = 3.14159265358979323846;
    std::vector<Vec3> bowed{{0, 0, -60}}, scalloped{{0, 0, -44}};
    for (int i = 0; i <= 30; ++i)
        bowed.push_back({9 + 3.5 * std::sin(pi * i / 30), 0, -60 + 2.0 * i});
    for (int s = 0; s < 6; ++s)
        for (int i = s > 0; i <= 8; ++i)
            scalloped.push_back({9 + 2 * std::sin(pi * i / 8), 0, -44 + 6 * (s + i / 8.0)});
    scalloped.push_back({9, 0, 0});
    return {
        make_round("straight hole", {{0, 0, -60}, {10, 0, -60}, {10, 0, 0}}),
        make_round("uneven floor", {{0, 0, -60},
                                    {2, 0, -59.98},
                                    {5, 0, -59.95},
                                    {8, 0, -60.01},
                                    {10, 0, -60.03},
                                    {10, 0, 0}}),
        make_round("tapered hole", {{0, 0, -60}, {6, 0, -60}, {11, 0, -5}, {14, 0, 0}}),
        make_round("bowed hole", bowed),
        make_round("necked hole",
                   {{0, 0, -40}, {14, 0, -40}, {14, 0, -8}, {5, 0, -6}, {4, 0, -4}, {7, 0, 0}}),
        make_round("scalloped hole", scalloped),
        make_round("domed floor",
                   {{0, 0, -25}, {5, 0, -28}, {9, 0, -33}, {11, 0, -32}, {12, 0, -20}, {9, 0, 0}}),
        make_round("hooked mask", {{0, 0, -30}, {12, 0, -30}, {12, 0, -6}, {8, 0, -9}, {8, 0, 0}})};
}

} // namespace rille::tests
