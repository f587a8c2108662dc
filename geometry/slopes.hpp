// SPDX-License-Identifier: Apache-2.0
// In a header because every cell of every sweep passes through it.
#pragma once

#include "geometry/band.hpp"

#include <algorithm>
#include <cstddef>

namespace rille::geometry {

/// One-sided slopes of phi at a cell, second order (minmod-limited); axes x, y, z. Where the band
/// ends the slope of the other side continues; so it does where `unseen` hides a neighbour (bit s:
/// side s).
struct Slopes {
    double minus[3] = {0, 0, 0}, plus[3] = {0, 0, 0};
    double mean(int axis) const { return 0.5 * (minus[axis] + plus[axis]); }
};

/// Of two values of one sign the one nearer to 0, else 0; without branches.
inline double minmod(double a, double b) {
    return std::max(0.0, std::min(a, b)) + std::min(0.0, std::max(a, b));
}

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

inline void slopes_along(const Band& band, const double* phi, std::size_t cell,
                         double inverse_spacing, int axis, unsigned unseen, Slopes& out) {
    const int c = static_cast<int>(cell);
    int left = band.neighbour[c][2 * axis], right = band.neighbour[c][2 * axis + 1];
    if (unseen >> 2 * axis & 1) left = -1;
    if (unseen >> (2 * axis + 1) & 1) right = -1;
    const double here = phi[c];
    if (left < 0 || right < 0) {
        // The edge of the band: second-order differences from the side that is there.
        const int side = left < 0 ? 2 * axis + 1 : 2 * axis, next = left < 0 ? right : left;
        if (next < 0) return;
        const int next2 = band.neighbour[next][side];
        const double near = phi[next] - here, bend = next2 < 0 ? 0 : phi[next2] - phi[next] - near;
        const double slope = (near - 0.5 * bend) * (left < 0 ? inverse_spacing : -inverse_spacing);
        out.minus[axis] = out.plus[axis] = slope;
        return;
    }
    // Beyond a mirror side the second neighbour is the first one on the other side.
    const int left2 = left == c ? right : band.neighbour[left][2 * axis];
    const int right2 = right == c ? left : band.neighbour[right][2 * axis + 1];
    const double back = here - phi[left], ahead = phi[right] - here, bend = ahead - back;
    const double bend_left = left2 < 0 ? bend : back - (phi[left] - phi[left2]);
    const double bend_right = right2 < 0 ? bend : (phi[right2] - phi[right]) - ahead;
    out.minus[axis] = (back + 0.5 * minmod(bend, bend_left)) * inverse_spacing;
    out.plus[axis] = (ahead - 0.5 * minmod(bend, bend_right)) * inverse_spacing;
}

inline Slopes slopes_2d(const Band& band, const double* phi, std::size_t cell,
                        double inverse_spacing, unsigned unseen) {
    Slopes s;
    slopes_along(band, phi, cell, inverse_spacing, 0, unseen, s);
    slopes_along(band, phi, cell, inverse_spacing, 2, unseen, s);
    return s;
}

inline Slopes slopes_3d(const Band& band, const double* phi, std::size_t cell,
                        double inverse_spacing, unsigned unseen) {
    Slopes s;
    for (int axis = 0; axis < 3; ++axis)
        slopes_along(band, phi, cell, inverse_spacing, axis, unseen, s);
    return s;
}

} // namespace rille::geometry
