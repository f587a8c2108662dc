// SPDX-License-Identifier: Apache-2.0
// Many rays at once: the shortcut of SegmentCaster::trace_across, step by step for a block of rays,
// then cell by cell for those that it does not serve.
#include "geometry/cast_lanes.hpp"
#include "geometry/segment_caster.hpp"
#include "geometry/vertex_sides.hpp"

#include <algorithm>

namespace rille::geometry {

struct SegmentCaster::Block {
    static constexpr int most = CastLanes::count;
    const RayStart* rays = nullptr;
    std::size_t left = 0;        ///< rays of this block and the following ones
    int count = 0;               ///< rays
    std::array<Cell, most> cell; ///< per ray: beyond the room, or nowhere
    std::array<bool, most> done; ///< per ray
    CastLanes lanes;
    int used = 0;              ///< lanes: rays that reach their room
    std::array<int, most> ray; ///< per lane
    std::array<const Room*, most> room;
    std::array<const Run*, most> run; ///< per lane: of the cell beyond, or null
    std::array<int, most> element;    ///< per lane: crossed in the first cell beyond, or -1
};

/// Fills the lanes with the rays that reach the room in front of their element.
void SegmentCaster::find_rooms_ahead(Block& b) const {
    b.used = 0;
    CastLanes& l = b.lanes;
    for (int n = 0; n < b.count; ++n) {
        const RayStart& ray = b.rays[n];
        __builtin_prefetch(b.rays + std::min<std::size_t>(n + 16, b.left - 1));
        b.cell[n] = nowhere;
        b.done[n] = false;
        if (ray.from_element < 0) continue;
        const Start& start = starts_[ray.from_element];
        const double dx = ray.direction.x, dz = ray.direction.z;
        if (!reaches_room(ray.direction, start) || !(dx * dx + dz * dz > least_square)) continue;
        const Room& room = rooms_[start.room];
        const int lane = b.used++;
        b.ray[lane] = n;
        b.room[lane] = &room;
        l.ox[lane] = ray.origin.x;
        l.oz[lane] = ray.origin.z;
        l.dx[lane] = dx;
        l.dz[lane] = dz;
        l.edge_x[lane] = room.x[!std::signbit(dx)];
        l.edge_z[lane] = room.z[!std::signbit(dz)];
    }
}

/// Finds the cell beyond the room and what it lists. Which edge a ray leaves by nobody can guess:
/// no branch.
void SegmentCaster::find_cells_ahead(Block& b) const {
    const CastLanes& l = b.lanes;
    const auto within = [](double v, const std::array<int, 2>& range) {
        return std::min(std::max(static_cast<int>(v), range[0]), range[1]);
    };
    for (int n = 0; n < b.used; ++n) {
        const Room& room = *b.room[n];
        const bool aside = l.aside[n] != 0;
        const int x = room.beyond.x[!std::signbit(l.dx[n])];
        const int z = room.beyond.z[!std::signbit(l.dz[n])];
        const int along =
            within(aside ? l.cell_z[n] : l.cell_x[n], aside ? room.cells.z : room.cells.x);
        const Cell cell{aside ? x : along, aside ? along : z};
        const int content = content_at(cell);
        b.cell[b.ray[n]] = cell;
        b.run[n] = content < 0 ? nullptr : &runs_[content];
        __builtin_prefetch(b.run[n]);
        __builtin_prefetch(reinterpret_cast<const char*>(b.run[n]) + 64);
    }
}

/// Finds the one segment of the cell that the ray crosses.
void SegmentCaster::find_segments_ahead(Block& b) const {
    CastLanes& l = b.lanes;
    for (int n = 0; n < b.used; ++n) {
        b.element[n] = -1;
        if (!b.run[n]) continue;
        const Run& run = *b.run[n];
        alignas(16) std::array<double, run_vertices> side;
        const unsigned right =
            vertices_on_right<run_vertices>(run.x.data(), run.z.data(), Pair{l.ox[n], l.oz[n]},
                                            Pair{l.dx[n], l.dz[n]}, 0.0, side.data());
        const unsigned crossed = right & ~(right >> 1) & run_segments;
        if (crossed == 0 || (crossed & (crossed - 1)) != 0 || !run.last) continue;
        const int k = __builtin_ctz(crossed);
        const Cell& cell = b.cell[b.ray[n]];
        b.element[n] = run.element + k;
        l.side_a[n] = side[k];
        l.side_b[n] = side[k + 1];
        l.ax[n] = run.x[k];
        l.az[n] = run.z[k];
        l.bx[n] = run.x[k + 1];
        l.bz[n] = run.z[k + 1];
        l.middle_x[n] = cell.x + 0.5;
        l.middle_z[n] = cell.z + 0.5;
    }
}

void SegmentCaster::trace(const RayStart* rays, std::size_t count, Hit* hits) const {
    const CastLanes::Grid grid{x_min_,          z_min_,          per_cell_x_, per_cell_z_,
                               x_min_ + width_, 0.5 + hit_reach, slack_};
    Block b;
    for (std::size_t first = 0; first < count; first += Block::most) {
        b.rays = rays + first;
        b.left = count - first;
        b.count = static_cast<int>(std::min<std::size_t>(Block::most, b.left));
        find_rooms_ahead(b);
        b.lanes.find_exits(grid);
        find_cells_ahead(b);
        find_segments_ahead(b);
        b.lanes.find_crossings(grid);
        for (int n = 0; n < b.used; ++n) {
            const RayStart& ray = b.rays[b.ray[n]];
            const int element = b.element[n];
            if (element < 0 || b.lanes.counts[n] == 0 || element == ray.from_element) continue;
            Hit& hit = hits[first + b.ray[n]];
            hit.kind = Hit::Kind::surface;
            hit.element = element;
            hit.distance = b.lanes.distance[n];
            hit.point =
                Vec3(b.lanes.x[n], ray.origin.y + hit.distance * ray.direction.y, b.lanes.z[n]);
            hit.direction = ray.direction;
            b.done[b.ray[n]] = true;
        }
        for (int n = 0; n < b.count; ++n) {
            if (b.done[n]) continue;
            Hit& hit = hits[first + n] = {};
            trace_by_cells(b.rays[n].origin, b.rays[n].direction, b.rays[n].from_element, b.cell[n],
                           hit);
        }
    }
}

} // namespace rille::geometry
