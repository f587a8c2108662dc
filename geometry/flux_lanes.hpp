// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <algorithm>
#include <cmath>

namespace rille::geometry {

constexpr double narrow_box = 0.05; ///< [rad] below it a box of slopes counts as a small cone
constexpr int turn_bins = 128;      ///< of RateTables::tilt, none wider than 1/32 rad

/// arcsin(x) by its series, exact to rounding for |x| < 1/32.
inline double short_arcsine(double x) {
    const double q = x * x;
    return x + x * q * (1.0 / 6 + q * (3.0 / 40 + q * (15.0 / 336 + q * (105.0 / 3456))));
}
/// Of the numbers between a and b.
inline double least_magnitude(double a, double b) {
    return a * b <= 0 ? 0 : std::min(std::fabs(a), std::fabs(b));
}
inline double most_magnitude(double a, double b) {
    return std::max(std::fabs(a), std::fabs(b));
}

/// Local Lax-Friedrichs fluxes of several cells, side by side: each step is one loop over the lanes
/// that the compiler turns into vector operations, as wide as the processor has them. The bits are
/// those of one cell after the other (see `lax_friedrichs`), whatever the width.
struct FluxLanes {
    static constexpr int count = 32;
    struct alignas(64) Values {
        double at[count] = {};
        double& operator[](int lane) { return at[lane]; }
        double operator[](int lane) const { return at[lane]; }
    };

    // Differences of phi along each axis [nm], to be set: to the neighbour on either side, second
    // difference here and at both neighbours.
    Values back[3], ahead[3], bend[3], bend_left[3], bend_right[3];
    // Found by find_slopes.
    Values minus[3], plus[3];
    Values horizontal, vertical, length; ///< of the mean slopes
    int turn_bin[count] = {};            ///< in [0, turn_bins]: see RateTables::tilt
    // The mark at the start of the bin, to be set for find_tilts, which finds angle and so on.
    Values mark_angle, mark_sine, mark_cosine;
    Values angle, sine, cosine;
    // The nodes of the rate table about the angle, to be set for find_fluxes: it lies between nodes
    // 1 and 2.
    Values node_angle[4], value[4];
    Values inverse_width[3];             ///< of the segment before node 1, 2, 3
    Values node_sine[2], node_cosine[2]; ///< of nodes 1 and 2
    // Found by find_fluxes.
    Values ordinary; ///< 1 where the box of slopes is a narrow cone between nodes 0 and 3, else 0
                     ///< and rate, waves and change do not count
    Values smooth;   ///< 1 or 0, as `smooth(Slopes)`
    Values rate, waves, change;

    void find_slopes(bool planar, double inverse_spacing);
    void find_tilts();
    void find_fluxes(bool planar);
};

} // namespace rille::geometry
