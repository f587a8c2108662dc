// SPDX-License-Identifier: Apache-2.0
// Private to fluxes.
#pragma once

#include "fluxes/unrolled_chain.hpp"

#include <array>
#include <cstddef>
#include <vector>

namespace rille::fluxes {

/// A place on a surface of revolution: x is the distance from the axis.
struct RingPoint {
    PlanePoint at;
    PlanePoint normal; ///< out of the solid
};

/// A range of the cosine of the azimuth between two rings.
struct CosineRange {
    double low = 0, high = 0;
};

/// Exchange between two coaxial discs: area times factor. z: distance of their planes.
/// Source: the classical result for parallel coaxial discs [from memory], without cancellation.
double disc_exchange(double radius_1, double radius_2, double z);

/// Factor from a point to a coaxial disc above it, all of which lies in front of the point.
/// Source: the classical results for a horizontal and a vertical element and a disc [from memory];
/// the wall of a cylinder has them as (X^2 + 1/2) / sqrt(X^2 + 1) - X, X = z / 2 R.
double factor_to_disc(const RingPoint&, double radius, double z);

/// Cosines of the azimuth at which the straight line between two rings crosses the frustum swept by
/// an edge; empty if low > high. With t the part of the way, the line's distance from the axis has
/// the square (1-t)^2 r1^2 + t^2 r2^2 + 2 t (1-t) r1 r2 cos: over the edge the cosine that meets it
/// is a rational function of t, whose extremes lie at the ends or where a quadratic vanishes.
CosineRange crossing(const PlanePoint& from, const PlanePoint& to, const PlanePoint& edge_start,
                     const PlanePoint& edge_end);

/// What can stand between two rings. Of solid that reaches outwards without end the vertices
/// suffice: the line's distance from the axis is convex along it, the solid's edge straight.
struct BetweenRings {
    const std::vector<PlanePoint>* point = nullptr;
    std::size_t first_edge = 0, last_edge = 0; ///< edges k -> k + 1, solid on one side, any kind
    /// Vertices with solid outside them, from `first_bore` by way of `next` to `last_bore`; -1:
    /// none. A vertex outside the straight line between two others hides nothing that those leave:
    /// `next` may pass it by.
    const std::vector<int>* next = nullptr;
    int first_bore = -1, last_bore = -1;
    /// Edges that belong to the rings themselves, first and last: facing says what they hide.
    std::array<std::array<std::size_t, 2>, 2> own{};
    bool is_own(std::size_t edge) const {
        return (edge >= own[0][0] && edge < own[0][1]) || (edge >= own[1][0] && edge < own[1][1]);
    }
};

/// Integral over the azimuth, both ways round, of cos cos / (pi distance^2) between two rings where
/// they face and nothing stands between: per area of `to`, the factor from `from`, divided by the
/// azimuth's 2 pi. In closed form; by 8 Gauss points a window where the rings are much farther
/// apart than their radii: there that would lose digits, and the integrand is smooth.
double ring_kernel(const RingPoint& from, const RingPoint& to, const BetweenRings&,
                   std::vector<CosineRange>& scratch);

/// Nodes and weights on [0, 1].
template <int N>
struct GaussRule {
    std::array<double, N> node, weight;
};
const GaussRule<3>& gauss_3();
const GaussRule<8>& gauss_8();
const GaussRule<16>& gauss_16();

} // namespace rille::fluxes
