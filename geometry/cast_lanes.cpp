// SPDX-License-Identifier: Apache-2.0
#include "geometry/cast_lanes.hpp"

#include <cmath>

namespace rille::geometry {

namespace {

constexpr int count = CastLanes::count;
constexpr double far_away = 1e300;

inline double inverse_of(double v) {
    const bool usable = std::fabs(v) > 1.0 / far_away;
    return usable ? 1.0 / (usable ? v : 1.0) : std::copysign(far_away, v);
}

} // namespace

#if defined(__x86_64__) && defined(__GNUC__)
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void exits_of_lanes(CastLanes&, const CastLanes::Grid&);
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void crossings_of_lanes(CastLanes&, const CastLanes::Grid&);
#endif

void exits_of_lanes(CastLanes& l, const CastLanes::Grid& grid) {
    const double x_min = grid.x_min, z_min = grid.z_min;
    const double per_cell_x = grid.per_cell_x, per_cell_z = grid.per_cell_z;
    for (int n = 0; n < count; ++n) {
        const double ox = l.ox[n], oz = l.oz[n], dx = l.dx[n], dz = l.dz[n];
        const double tx = (l.edge_x[n] - ox) * inverse_of(dx);
        const double tz = (l.edge_z[n] - oz) * inverse_of(dz);
        const double t = tz < tx ? tz : tx;
        l.cell_x[n] = (ox + t * dx - x_min) * per_cell_x;
        l.cell_z[n] = (oz + t * dz - z_min) * per_cell_z;
        l.aside[n] = tx < tz ? 1.0 : 0.0;
        l.square[n] = dx * dx + dz * dz;
    }
}

void crossings_of_lanes(CastLanes& l, const CastLanes::Grid& grid) {
    const double x_min = grid.x_min, z_min = grid.z_min, x_max = grid.x_max;
    const double per_cell_x = grid.per_cell_x, per_cell_z = grid.per_cell_z;
    const double reach = grid.reach, slack_square = grid.slack * grid.slack;
    for (int n = 0; n < count; ++n) {
        const double share = l.side_a[n] / (l.side_a[n] - l.side_b[n]);
        const double x = l.ax[n] + share * (l.bx[n] - l.ax[n]);
        const double z = l.az[n] + share * (l.bz[n] - l.az[n]);
        const double off_x = std::fabs((x - x_min) * per_cell_x - l.middle_x[n]);
        const double off_z = std::fabs((z - z_min) * per_cell_z - l.middle_z[n]);
        const double way = (x - l.ox[n]) * l.dx[n] + (z - l.oz[n]) * l.dz[n];
        const double square = l.square[n];
        const bool counts =
            (off_x <= reach) & (off_z <= reach) & (way > 0) & (way * way > slack_square * square);
        l.counts[n] = counts ? 1.0 : 0.0;
        l.distance[n] = way / square;
        const double right = x < x_min ? x_min : x;
        l.x[n] = x_max < right ? x_max : right;
        l.z[n] = z;
    }
}

void CastLanes::find_exits(const Grid& grid) {
    exits_of_lanes(*this, grid);
}
void CastLanes::find_crossings(const Grid& grid) {
    crossings_of_lanes(*this, grid);
}

} // namespace rille::geometry
