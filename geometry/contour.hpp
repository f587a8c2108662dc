// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the zero contour of a band in one plane as chains of points.
#pragma once

#include "geometry/band.hpp"

#include <vector>

namespace rille::geometry {

struct ContourPoint {
    Vec3 p;             ///< [nm], y = 0; not wrapped: a chain runs on across a periodic side
    bool fixed = false; ///< on a mirror side or the axis, or a rebuilt corner
};

/// Connected points with the gas on the left.
struct ContourChain {
    std::vector<ContourPoint> points;
    bool closed = false; ///< the last point joins the first, displaced by `shift` along x
    double shift = 0;    ///< [nm] 0, or +-width_x for a chain that runs across a periodic domain
};

/// Marching squares on the dual cells of a band in one plane; where a cell is ambiguous the mean of
/// its four values decides. At a mirror side phi is extrapolated from inside to the side plane.
std::vector<ContourChain> contour_chains(const Band&);

/// Rebuilds corners where one-sided tangents differ by more than 30 degrees: a point at the
/// intersection of the lines fitted to either side, beyond the cells that the corner disturbs.
void rebuild_corners(ContourChain&, const Domain&);

/// Removes points until no segment is shorter than `shortest` [nm] (fixed points stay).
void merge_slivers(ContourChain&, double shortest);

} // namespace rille::geometry
