// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the dual mesh of a full (three-dimensional) band. Every grid edge whose ends
// differ in sign gives one quad through the four dual cells round it; a dual cell has one vertex
// for every separate sheet (loop of crossed edges) that passes through it, so the mesh is manifold.
#pragma once

#include "geometry/extract_surface.hpp"

#include <array>
#include <cmath>
#include <cstdint>
#include <vector>

namespace rille::geometry {

/// A dual cell: the cube between eight nodes. At a mirror side a half cell ends on the side plane;
/// its outer nodes are its inner ones, and `low` says that it lies below its node along x or y.
struct DualCell {
    int node = 0;                ///< lower corner, as band index
    std::array<bool, 2> low{};   ///< half cell between the lower side and its node
    std::array<int, 8> corner{}; ///< band indices; bit 0, 1, 2 of the position: upper in x, y, z
    std::array<std::int8_t, 12> loop{}; ///< sheet of each edge, -1 if not crossed (see edge_number)
    int sheets = 0;
    int first_vertex = 0;
};

/// The quad of one crossed grid edge: four vertices, anticlockwise seen from the gas, each with the
/// image it is taken in (bit 0: moved by -width_x, bit 1: by -width_y).
struct DualQuad {
    int node = 0;
    std::uint8_t axis = 0;
    bool up = true; ///< the gas lies on the upper side of the edge
    std::array<int, 4> vertex{};
    std::array<std::uint8_t, 4> image{};
};

struct DualMesh {
    std::vector<DualCell> cells;
    std::vector<DualQuad> quads;
    std::vector<int> cell_of_vertex;
    std::vector<Vec3> position; ///< per vertex [nm]
    std::vector<Vec3> crossing; ///< per quad: where the surface crosses its grid edge [nm]
    std::vector<Vec3> normal;   ///< per quad, unit; 0 where it has collapsed
    std::vector<int> first;     ///< per vertex, and one more: where its quads start in `round`
    std::vector<int> round;     ///< quads round each vertex, by rising number
};

/// Number of the edge along `axis` that starts at cube corner `corner`.
inline int edge_number(int axis, int corner) {
    return 4 * axis + (corner >> (axis + 1) % 3 & 1) + 2 * (corner >> (axis + 2) % 3 & 1);
}

/// Cells, sheets and quads, without positions. Throws InternalError if a surface cell is not wholly
/// inside the band.
DualMesh dual_topology(const Band&);

/// An edge of a dual cell with the point where the surface crosses it. In cells on a side of the
/// period the edge is moved onto the side plane, where the mesh ends.
struct CrossedEdge {
    Vec3 a, b, crossing;
};
struct CrossedCell {
    std::array<CrossedEdge, 12> edge;
    int count = 0;
    std::array<bool, 3> on_side{}; ///< x, y: the vertex must stay on the side plane
    Vec3 low, high;                ///< the cell's box

    Vec3 mean() const {
        Vec3 sum(0, 0, 0);
        for (int n = 0; n < count; ++n)
            sum += edge[n].crossing;
        return sum / count;
    }
};
CrossedCell crossed_cell(const Band&, const DualMesh&, int vertex);

/// Puts every vertex at the mean of its crossings, lifted onto the curved surface through them: on
/// a plane to round-off. Fills all of the mesh.
void place_vertices(const Band&, DualMesh&);

/// Moves vertices near sharp edges and corners onto the planes fitted to either side, where
/// one-sided normals differ by more than 30 degrees.
void sharpen(const Band&, DualMesh&);

/// Normal of a quad, twice its area long [nm^2].
Vec3 across(const Domain&, const DualMesh&, const DualQuad&);

/// b - a [nm], through the nearest image in a periodic domain.
inline Vec3 between(const Domain& domain, const Vec3& a, const Vec3& b) {
    Vec3 d = b - a;
    if (domain.sides == Sides::periodic) {
        const double wx = domain.width_x(), wy = domain.width_y();
        if (std::fabs(d.x) > 0.5 * wx) d.x -= wx * std::round(d.x / wx);
        if (std::fabs(d.y) > 0.5 * wy) d.y -= wy * std::round(d.y / wy);
    }
    return d;
}

} // namespace rille::geometry
