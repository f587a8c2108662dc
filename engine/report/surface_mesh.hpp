// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"
#include "geometry/vec.hpp"

#include <array>
#include <cstddef>
#include <vector>

namespace rille::engine {

/// A surface as triangles for a viewer, anticlockwise seen from the gas.
struct SurfaceMesh {
    std::vector<geometry::Vec3> vertices; ///< [nm]
    std::vector<std::array<int, 3>> triangles;
    std::vector<int> material; ///< per triangle, index into Case::materials
    double edge_nm = 0;        ///< edge of the cubes in which vertices were joined; 0 = none were
};

/// The surface of a `full` state with at most `most` vertices: where it has more, the vertices
/// within cubes are joined, the smallest cubes that suffice (in steps of 25 %, from 1.5 spacings).
SurfaceMesh surface_mesh(const SurfaceState&, double spacing, std::size_t most);

} // namespace rille::engine
