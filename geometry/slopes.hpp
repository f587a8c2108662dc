// SPDX-License-Identifier: Apache-2.0
// In a header because every cell of every sweep passes through it.
#pragma once

#include "geometry/band.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>

namespace rille::geometry {

/// One-sided slopes of phi at a cell, second or third order where phi is smooth (see Limiter); axes
/// x, y, z. Where the band ends the slope of the other side continues; so it does where `unseen`
/// hides a neighbour (bit s: side s; bit 6 + s: the second neighbour on side s, for second
/// differences).
struct Slopes {
    double minus[3] = {0, 0, 0}, plus[3] = {0, 0, 0};
    double mean(int axis) const { return 0.5 * (minus[axis] + plus[axis]); }
};

/// Whether the slopes of both sides agree to about 6 degrees: no edge passes the cell.
inline bool smooth(const Slopes& s) {
    double apart = 0, steep = 0;
    for (int a = 0; a < 3; ++a) {
        const double d = s.plus[a] - s.minus[a], m = s.mean(a);
        apart += d * d;
        steep += m * m;
    }
    return apart < 0.01 * steep;
}

/// How the second difference in a slope follows from those at the near and the far node; 0 where
/// they differ in sign. A rate that does not depend on the normal has a convex Hamiltonian, whose
/// solution any limiter finds, so there accuracy decides. A rate that depends on the normal has one
/// that is neither convex nor concave, and steep limiters then settle at kinks with wrong slopes
/// beside them, an error that does not fall with the grid (Qiu and Shu, SIAM J. Sci. Comput. 31
/// (2008) 584, from memory); a smooth, gentle one does not, and is better than minmod on facets.
enum class Limiter {
    isotropic,   ///< third order where both agree within a factor of 4 (Koren), else twice the less
    directional, ///< van Albada's mean: second order, at most 1.21 times the less
};

inline double limited_bend(double near, double far, Limiter limiter) {
    const double product = near * far;
    if (limiter == Limiter::directional) { // without a branch: signs are hard to guess
        constexpr double not_zero = std::numeric_limits<double>::min();
        return std::max(product, 0.0) * (near + far) / (near * near + far * far + not_zero);
    }
    if (product <= 0) return 0;
    const double third = (2 * near + far) * (1.0 / 3);
    const double most = 2 * std::min(std::fabs(near), std::fabs(far));
    return std::fabs(third) <= most ? third : std::copysign(most, near);
}

/// Differences of phi along an axis [nm]: from the neighbours on either side, and second ones here
/// and at these neighbours.
struct Differences {
    double back = 0, ahead = 0, bend = 0, bend_left = 0, bend_right = 0;
};

inline Differences differences_along(const Band& band, const double* phi, std::size_t cell,
                                     int axis, unsigned unseen) {
    const int c = static_cast<int>(cell);
    int left = band.neighbour[c][2 * axis], right = band.neighbour[c][2 * axis + 1];
    if (unseen >> 2 * axis & 1) left = -1;
    if (unseen >> (2 * axis + 1) & 1) right = -1;
    const double here = phi[c];
    if (left < 0 || right < 0) {
        // The edge of the band: second-order differences from the side that is there.
        const int side = left < 0 ? 2 * axis + 1 : 2 * axis, next = left < 0 ? right : left;
        if (next < 0) return {};
        const int next2 = band.neighbour[next][side];
        const double near = phi[next] - here, bend = next2 < 0 ? 0 : phi[next2] - phi[next] - near;
        const double rise = left < 0 ? near - 0.5 * bend : -(near - 0.5 * bend);
        return {rise, rise, 0, 0, 0};
    }
    // Beyond a mirror side the second neighbour is the first one on the other side.
    int left2 = left == c ? right : band.neighbour[left][2 * axis];
    int right2 = right == c ? left : band.neighbour[right][2 * axis + 1];
    if (unseen >> (6 + 2 * axis) & 1) left2 = -1;
    if (unseen >> (7 + 2 * axis) & 1) right2 = -1;
    const double back = here - phi[left], ahead = phi[right] - here, bend = ahead - back;
    return {back, ahead, bend, left2 < 0 ? bend : back - (phi[left] - phi[left2]),
            right2 < 0 ? bend : (phi[right2] - phi[right]) - ahead};
}

inline void slopes_along(const Band& band, const double* phi, std::size_t cell,
                         double inverse_spacing, int axis, unsigned unseen, Limiter limiter,
                         Slopes& out) {
    const Differences d = differences_along(band, phi, cell, axis, unseen);
    out.minus[axis] = (d.back + 0.5 * limited_bend(d.bend, d.bend_left, limiter)) * inverse_spacing;
    out.plus[axis] =
        (d.ahead - 0.5 * limited_bend(d.bend, d.bend_right, limiter)) * inverse_spacing;
}

/// Slopes along z at a cell whose neighbour on `side` (4 or 5) lies behind a face, `gap` [nm] away,
/// that the front runs along: phi continues as its mirror image in the face. The fan that spreads
/// below a mask meets it at a right angle; where the front meets it otherwise, the information
/// comes from within the film and Godunov's flux does not look at the image.
inline void mirror_slopes(const Band& band, const double* phi, std::size_t cell,
                          double inverse_spacing, int side, double gap, Limiter limiter,
                          Slopes& out) {
    const int next = band.neighbour[cell][9 - side];
    if (next < 0) return;
    const int next2 = band.neighbour[next][9 - side];
    const double share = gap * inverse_spacing, near = phi[next] - phi[cell];
    // Even about the face through this cell and the next one.
    const double image = near * (1 - 2 * share) / (1 + 2 * share);
    const double bend = image + near;
    const double bend_next = next2 < 0 ? bend : phi[next2] - phi[next] - near;
    const double towards = (image - 0.5 * bend) * inverse_spacing;
    const double back = (near - 0.5 * limited_bend(bend, bend_next, limiter)) * inverse_spacing;
    out.plus[2] = side == 5 ? towards : back;
    out.minus[2] = side == 5 ? -back : -towards;
}

inline Slopes slopes_2d(const Band& band, const double* phi, std::size_t cell,
                        double inverse_spacing, unsigned unseen, Limiter limiter) {
    Slopes s;
    slopes_along(band, phi, cell, inverse_spacing, 0, unseen, limiter, s);
    slopes_along(band, phi, cell, inverse_spacing, 2, unseen, limiter, s);
    return s;
}

inline Slopes slopes_3d(const Band& band, const double* phi, std::size_t cell,
                        double inverse_spacing, unsigned unseen, Limiter limiter) {
    Slopes s;
    for (int axis = 0; axis < 3; ++axis)
        slopes_along(band, phi, cell, inverse_spacing, axis, unseen, limiter, s);
    return s;
}

} // namespace rille::geometry
