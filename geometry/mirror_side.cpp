// SPDX-License-Identifier: Apache-2.0
#include "geometry/mirror_side.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double straight = 1.05; ///< slopes that grow no faster inwards are those of a plane
constexpr double bent = 1.25;     ///< from here on they are those of something even about the side
constexpr double level = 0.03;    ///< slope of phi at which noise hides the difference
constexpr double inclined = 0.06; ///< and from which on it does not

double share(double x, double from, double to) {
    return std::clamp((x - from) / (to - from), 0.0, 1.0);
}

} // namespace

double change_to_side(const Band& band, int node, int axis, bool low) {
    const int inwards = 2 * axis + (low ? 1 : 0);
    const int one = band.neighbour[node][inwards];
    if (one < 0 || one == node) return 0;
    const double slope = band.phi[one] - band.phi[node];
    const int two = band.neighbour[one][inwards];
    const double next = two < 0 || two == one ? slope : band.phi[two] - band.phi[one];
    const double growth = slope == 0 ? 0 : next / slope;
    const double even = std::max(share(std::fabs(slope) / band.domain.spacing, inclined, level),
                                 share(growth, straight, bent));
    return -(0.5 - 0.375 * even) * slope;
}

} // namespace rille::geometry
