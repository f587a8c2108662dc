// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <cstdint>
#include <vector>

namespace rille::geometry {

/// First hits on an extruded surface: rays are projected on the plane y = 0 and intersected with
/// the segments there. A uniform grid over the period holds the segments; every empty cell knows
/// one rectangle of empty cells around it, so a ray crosses the open space in one step.
///
/// Watertight: whether a segment is crossed depends only on which side of the ray its two vertices
/// lie, and a shared vertex gives both its segments the same answer. Only the gas side of a segment
/// is hit.
class SegmentCaster {
public:
    SegmentCaster(const Domain&, const Surface&, double z_open);

    /// As RayCaster::trace.
    Hit trace(const Vec3& origin, const Vec3& direction, int from_element) const;

private:
    /// Up to `run_length` consecutive elements of a chain: their vertices. Unused places repeat the
    /// last one. Two cache lines.
    static constexpr int run_length = 5, run_vertices = run_length + 1;
    struct alignas(64) Run {
        std::array<double, run_vertices> x, z;
        int element; ///< of the first two vertices
        bool last;   ///< of its cell
    };
    struct Rectangle { ///< inclusive ranges of cells
        int x0, x1, z0, z1;
    };
    /// A rectangle of empty cells, which a ray crosses in one step.
    struct Room {
        double x_low, x_high, z_low, z_high; ///< [nm]
        Rectangle cells;
    };
    struct Ray;  // the ray in the frame of the image it is in
    struct Best; // nearest crossing so far

    void choose_grid(const Surface&);
    int columns_that_fit(double wanted) const;
    void fill_cells(const Surface&);
    void bound_skyline(const std::vector<int>& elements);
    double skyline_over(int element, int other) const;
    Run make_run(int first, int count) const;
    void add_runs(const std::vector<int>& elements, const Surface&);
    void find_rectangles();
    void lay_out_cells();
    Rectangle grow(int ix, int iz, const std::vector<int>& sums) const;
    std::vector<int> occupancy_sums() const;
    bool occupied(int cell) const { return content_[cell] >= 0; }
    Room room(const Rectangle&) const;
    std::vector<int> cells_by_clearance() const;

    bool enter(Ray&) const;
    void fold_into_period(Ray&, double t) const;
    void cross_cell(Ray&, bool aside) const;
    void cross_room(Ray&, const Rectangle&, bool aside) const;
    bool cross_side(Ray&) const;
    void test_runs(const Ray&, const Run*, Best&) const;
    void test_segment(const Ray&, const Run&, int k, double share, Best&) const;
    void finish_hit(const Ray&, const Best&, Hit&) const;
    void finish_open(Ray&, Hit&) const;
    std::array<double, 2> normal_beyond(int element, int end) const;
    bool concave_at(int element, int end) const;
    bool behind_at_start(int from, int element) const {
        return (element == joined_[from][0] && !concave_[from][0]) ||
               (element == joined_[from][1] && !concave_[from][1]);
    }
    bool clears_own_cell(const Vec3& direction, int from) const;
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
    /// Per element: a ray that leaves it more steeply than this (tangent of the elevation over the
    /// segment) passes over everything else in the cells that hold it.
    std::vector<double> skyline_;
    int next_x_ = 1, next_z_ = 1; ///< steps in content_; the longer way lies together in memory
    std::vector<int> content_;    ///< per cell: its first run, or if empty -1 - its room
    std::vector<Room> rooms_;
    std::vector<Run> runs_; ///< copies, cell after cell
};

} // namespace rille::geometry
