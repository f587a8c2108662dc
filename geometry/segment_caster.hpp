// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <vector>

namespace rille::geometry {

/// First hits on an extruded surface: rays are projected on the plane y = 0 and intersected with
/// the segments there. A uniform grid over the period holds the segments; every empty cell knows
/// one rectangle of empty cells around it, so a ray crosses the open space in one step. A segment
/// knows the rectangle in front of it and which directions reach that without meeting anything:
/// most rays that leave a surface visit that rectangle and the cell of their hit, no more.
///
/// Hits are looked for cell by cell. A cell lists what crosses it or passes close by, and a hit
/// counts where it lies in the cell or closer by still, so neither round-off in the cells that a
/// ray visits nor a hit on their edges matters.
///
/// Watertight: whether a segment is crossed depends only on which side of the ray its two vertices
/// lie, and a shared vertex gives both its segments the same answer. Only the gas side of a segment
/// is hit.
class SegmentCaster {
public:
    SegmentCaster(const Domain&, const Surface&, double z_open);

    /// As RayCaster::trace.
    Hit trace(const Vec3& origin, const Vec3& direction, int from_element) const;
    /// The same hits, to the bit, for many rays at once: what they compute runs side by side.
    void trace(const RayStart* rays, std::size_t count, Hit* hits) const;

private:
    /// Up to `run_length` consecutive elements of a chain: their vertices. Unused places repeat the
    /// last one. Two cache lines.
    static constexpr int run_length = 5, run_vertices = run_length + 1;
    static constexpr unsigned run_segments = (1u << run_length) - 1; ///< one bit each
    struct alignas(64) Run {
        std::array<double, run_vertices> x, z;
        int element; ///< of the first two vertices
        bool last;   ///< of its cell
    };
    struct Rectangle { ///< of cells, limits inclusive: low, high
        std::array<int, 2> x, z;
    };
    static constexpr double cell_pad = 1e-6; ///< [cells]
    /// [cells] a cell lists what comes this close to it, and has hits a little less far away: a ray
    /// then meets most walls in the first cell of theirs that it gets to.
    static constexpr double list_reach = 0.25, hit_reach = list_reach - cell_pad;
    static constexpr int outside = -std::numeric_limits<int>::max(); ///< content beyond the grid
    /// A rectangle of empty cells, which a ray crosses in one step.
    struct alignas(64) Room {
        std::array<double, 2> x, z; ///< low, high [nm]
        Rectangle cells, beyond;    ///< in it; the next ones outside
    };
    struct Cell {
        int x, z;
    };
    static constexpr double least_square = 1e-24; ///< of the part of a unit direction in the plane
    static constexpr Cell nowhere{std::numeric_limits<int>::min(), 0};
    /// A ray that leaves an element more steeply than its skyline reaches `room` without meeting
    /// anything. Skyline: tangent of the elevation over the segment, for rays towards the start of
    /// the segment and for rays towards its end.
    struct Start {
        double along_x, along_z; ///< from a to b
        std::array<double, 2> skyline;
        int room;
    };
    struct Ray; // the ray in the frame of the image it is in
    struct Crossing;
    struct Block; // rays that are traced together

    void choose_grid(const Surface&);
    int columns_that_fit(double wanted) const;
    std::vector<std::vector<int>> list_elements() const;
    template <class Visit>
    void visit_cells(int element, double pad, Visit) const;
    void fill_cells(const std::vector<std::vector<int>>& lists, const Surface&);
    Run make_run(int first, int count) const;
    void add_runs(const std::vector<int>& elements, const Surface&);
    void find_rooms();
    void find_starts(const std::vector<std::vector<int>>& lists);
    Start start_of(int element, const std::vector<std::vector<int>>& lists) const;
    bool aim_at_gate(Start&, int element, const Rectangle& gate, bool aside, bool ahead) const;
    void raise_over(Start&, int element, int other) const;
    void lay_out_cells();
    Rectangle grow(int ix, int iz, const std::vector<int>& sums) const;
    std::vector<int> occupancy_sums() const;
    bool occupied(int cell) const { return content_[cell] >= 0; }
    Room room(const Rectangle&) const;
    std::vector<int> cells_by_clearance() const;
    int column(double x) const; ///< x, z in cells
    int row(double z) const;

    Cell cell_beyond(const Room&, const Vec3& origin, const Vec3& direction) const;
    void find_rooms_ahead(Block&) const;
    void find_cells_ahead(Block&) const;
    void find_segments_ahead(Block&) const;
    bool trace_across(const Vec3& origin, const Vec3& direction, int from, Hit&, Cell&) const;
    void trace_by_cells(const Vec3& origin, const Vec3& direction, int from, Cell, Hit&) const;
    bool enter(Ray&) const;
    void fold_into_period(Ray&, double t) const;
    int content_at(const Cell& cell) const {
        return content_[(cell.z + 1) * next_z_ + (cell.x + 1) * next_x_];
    }
    void cross_cell(Ray&) const;
    void cross_room(Ray&, const Room&) const;
    bool cross_side(Ray&) const;
    bool test_runs(const Ray&, const Run*, Crossing& nearest) const;
    bool test_segment(const Ray&, const Run&, int k, double share, Crossing&) const;
    bool counts_at_start(const Ray&, int element, double way) const;
    void finish_hit(const Ray&, const Crossing&, Hit&) const;
    void finish_open(Ray&, Hit&) const;
    std::array<double, 2> normal_beyond(int element, int end) const;
    bool concave_at(int element, int end) const;
    bool behind_at_start(int from, int element) const {
        return (element == joined_[from][0] && !concave_[from][0]) ||
               (element == joined_[from][1] && !concave_[from][1]);
    }
    /// Whether a ray reaches the room in front of the element that it leaves. The margin is for
    /// rays along a straight wall, which round-off takes to either side of it.
    bool reaches_room(const Vec3& direction, const Start& start) const {
        constexpr double margin = 1e-6;
        const double up = start.along_x * direction.z - start.along_z * direction.x;
        const double along = start.along_x * direction.x + start.along_z * direction.z;
        return up > (start.skyline[along > 0] + margin) * std::fabs(along);
    }
    bool starts_in_joint(const Vec3& origin, const Vec3& direction, int from, Hit&) const;

    Domain domain_;
    double z_open_ = 0;
    double width_ = 0, x_min_ = 0, z_min_ = 0, z_top_ = 0;
    double cell_x_ = 1, cell_z_ = 1, per_cell_x_ = 1, per_cell_z_ = 1;
    int nx_ = 1, nz_ = 1;
    double slack_ = 0;                         ///< [nm] hits this far behind the origin still count
    std::vector<std::array<double, 4>> ends_;  ///< per element: ax, az, bx, bz
    std::vector<std::array<bool, 2>> concave_; ///< per element: at its start, at its end
    std::vector<std::array<int, 2>> joined_;   ///< element before and after; -1 at a mirror side
    std::vector<Start> starts_;                ///< per element
    int next_x_ = 1, next_z_ = 1; ///< steps in content_; the longer way lies together in memory
    /// Per cell: its first run, or if empty -1 - its room. With a ring of `outside` about the grid.
    std::vector<int> content_;
    std::vector<Room> rooms_;
    std::vector<Run> runs_; ///< copies, cell after cell
};

} // namespace rille::geometry
