// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rille::geometry {

/// The arithmetic of SegmentCaster's shortcut for several rays, side by side: see FluxLanes.
struct CastLanes {
    static constexpr int count = 32;
    struct alignas(64) Values {
        double at[count] = {};
        double& operator[](int lane) { return at[lane]; }
        double operator[](int lane) const { return at[lane]; }
    };
    /// Of the grid of cells.
    struct Grid {
        double x_min, z_min, per_cell_x, per_cell_z, x_max;
        double reach; ///< [cells] of hits from the middle of a cell
        double slack; ///< [nm]
    };
    // To be set for find_exits: origin, direction, and the edges of the room ahead.
    Values ox, oz, dx, dz, edge_x, edge_z;
    Values cell_x, cell_z; ///< where the ray leaves the room, in whole cells, not yet clamped
    Values aside;          ///< 1 where it leaves at edge_x, else 0
    Values square;         ///< of the part of the direction in the plane
    // To be set for find_crossings: sides of the ends of the segment, the ends, middle of the cell.
    Values side_a, side_b, ax, az, bx, bz, middle_x, middle_z;
    Values x, z, distance; ///< of the crossing
    Values counts;         ///< 1 where it is one, else 0

    void find_exits(const Grid&);
    void find_crossings(const Grid&);
};

} // namespace rille::geometry
