// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/raw_vector.hpp"

#include <array>

namespace rille::geometry {

/// The narrow band of the level set as flat arrays: what every sweep over the front works on.
/// phi < 0 in the solid, > 0 in the gas [nm]. Cells are sorted by (k, j, i), so the order, and with
/// it every sum, does not depend on history or threads.
struct Band {
    struct Cell {
        int i, j, k;
    };
    Domain domain;
    RawVector<Cell> cells;
    RawVector<double> phi;
    /// Neighbours in the order -x, +x, -y, +y, -z, +z; sides are built in (a mirror neighbour of an
    /// outermost node is the node itself). -1 outside the band; in extruded -y and +y are -1.
    RawVector<std::array<int, 6>> neighbour;

    std::size_t size() const { return cells.size(); }
};

} // namespace rille::geometry
