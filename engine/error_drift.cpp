// SPDX-License-Identifier: Apache-2.0
#include "engine/error_drift.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

using geometry::NormalRates;
using geometry::Surface;

constexpr double corner_cosine = 0.8660254037844387; // 30 degrees

/// dR/dpsi [nm/s] of the outermost material at the element's own normal.
double slope_of_rate(const Surface& surface, const NormalRates& rates, int e) {
    const int row = rates.first_row[e];
    if (row == rates.first_row[e + 1]) return 0;
    const auto& angles = rates.angles;
    const double psi = std::atan2(surface.normal[e].x, surface.normal[e].z);
    const auto above = std::upper_bound(angles.begin(), angles.end(), psi) - angles.begin();
    const std::size_t k = std::clamp<std::ptrdiff_t>(above, 1, angles.size() - 1);
    const double* rate = &rates.table[row * angles.size()];
    return (rate[k] - rate[k - 1]) / (angles[k] - angles[k - 1]);
}

/// Three neighbours of a chain and their weights; at a corner or an end they stand for less.
struct Source {
    int element[3];
    double weight[3];
};

/// The neighbour of e in these links, or e itself where a corner or an end lies between.
int beside(const Surface& surface, const std::vector<int>& links, int e) {
    const int other = links[e];
    const bool apart = other < 0 || surface.normal[e].dot(surface.normal[other]) < corner_cosine;
    return apart ? e : other;
}

/// The place `distance` [nm] further on in walking order from the centre of element e, by the
/// parabola through the nearest centre and its neighbours: to go straight between two centres
/// would smooth the errors step by step.
Source along(const Surface& surface, int e, double distance) {
    const bool onwards = distance > 0;
    const auto& ahead = onwards ? surface.next : surface.previous;
    const auto& behind = onwards ? surface.previous : surface.next;
    double left = std::fabs(distance), x = 0;
    for (std::size_t walked = 0; walked < surface.size(); ++walked) {
        const int other = beside(surface, ahead, e);
        if (other == e) break;
        const double between = 0.5 * (surface.length(e) + surface.length(other));
        x = left / between;
        if (x <= 0.5) break;
        left -= between;
        e = other;
        x = left / between; // from -0.5
        if (left <= 0) break;
    }
    const int after = beside(surface, ahead, e), before = beside(surface, behind, e);
    x = after == e ? std::min(x, 0.0) : before == e ? std::max(x, 0.0) : x;
    if (after == e || before == e)
        return {{before, e, after}, {x < 0 ? -x : 0, 1 - std::fabs(x), x > 0 ? x : 0}};
    return {{before, e, after}, {0.5 * x * (x - 1), 1 - x * x, 0.5 * x * (x + 1)}};
}

} // namespace

void drift_along_contour(const Surface& surface, const NormalRates& rates, double time,
                         std::vector<std::vector<double>>& errors) {
    const int size = static_cast<int>(surface.size());
    std::vector<Source> sources(size);
    for (int e = 0; e < size; ++e)
        sources[e] = along(surface, e, slope_of_rate(surface, rates, e) * time);
    for (std::vector<double>& field : errors) {
        const std::vector<double> before = field;
        for (int e = 0; e < size; ++e) {
            field[e] = 0;
            for (int k = 0; k < 3; ++k)
                field[e] += sources[e].weight[k] * before[sources[e].element[k]];
        }
    }
}

} // namespace rille::engine
