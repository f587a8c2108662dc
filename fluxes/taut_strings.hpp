// SPDX-License-Identifier: Apache-2.0
// Private to fluxes.
#pragma once

#include "fluxes/unrolled_chain.hpp"

#include <array>
#include <vector>

namespace rille::fluxes {

/// Shortest paths inside a simple polygon: strings pulled taut from one vertex to all others.
///
/// The polygon is cut into triangles by clipping ears; the triangles hang together as a tree. From
/// a vertex the strings to the two ends of every edge between triangles form a funnel, and the
/// string to the vertex beyond the edge is a tangent to that funnel. Linear in the vertices but for
/// the walks along funnels.
/// Source: Lee & Preparata, Networks 14, 393 (1984); Guibas et al., Algorithmica 2, 209 (1987)
/// [citations from memory].
class TautStrings {
public:
    /// Vertices anticlockwise: the inside lies to the left. Throws NumericsError where the
    /// boundary touches or crosses itself.
    explicit TautStrings(std::vector<PlanePoint> polygon);

    /// Lengths of the strings from vertex `from` to every vertex.
    std::vector<double> lengths(int from) const;

private:
    struct Triangle {
        std::array<int, 3> corner;    ///< anticlockwise
        std::array<int, 3> neighbour; ///< across the edge from corner k to corner k + 1, or -1
    };
    struct Funnel;
    class Clipping;
    struct Touch {
        int vertex, side;
    };
    Touch tangent(const Funnel&, int to, const std::vector<int>& parent) const;
    double turn(int a, int b, int c) const;

    std::vector<PlanePoint> point_;
    std::vector<Triangle> triangle_;
    std::vector<int> triangle_at_; ///< per vertex: one triangle that has it as a corner
};

} // namespace rille::fluxes
