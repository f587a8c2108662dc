// SPDX-License-Identifier: Apache-2.0
#include "geometry/check.hpp"
#include "geometry/segment_caster.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

namespace rille::geometry {

namespace {
constexpr int nothing = std::numeric_limits<int>::min(); ///< content of a cell not yet known
} // namespace

void SegmentCaster::choose_grid(const Surface& surface) {
    double low = std::numeric_limits<double>::infinity(), high = -low, length = 0;
    for (const auto& e : ends_) {
        low = std::min({low, e[1], e[3]});
        high = std::max({high, e[1], e[3]});
        length += std::hypot(e[2] - e[0], e[3] - e[1]);
    }
    RILLE_CHECK(z_open_ >= high, "the source plane lies below the top of the surface");
    const double n = static_cast<double>(surface.size());
    // About sixteen cells a segment: a run of five fits what a cell of a trench lists.
    const double area = width_ * (high - low + 1e-3 * length);
    const double size = std::max(1.2 * length / n, std::sqrt(area / (16 * n)));
    nx_ = columns_that_fit(width_ / size);
    cell_x_ = width_ / nx_;
    // The grid ends exactly at the top: a ray that rises above it is free.
    z_min_ = low - 0.25 * size;
    z_top_ = high;
    nz_ = std::max(1, static_cast<int>(std::ceil((high - z_min_) / size)));
    cell_z_ = (high - z_min_) / nz_;
    per_cell_x_ = 1.0 / cell_x_;
    per_cell_z_ = 1.0 / cell_z_;
}

/// A number of columns near `wanted` that puts walls just inside their cells, next to the gas: a
/// ray then meets the wall soon after the open space ends.
int SegmentCaster::columns_that_fit(double wanted) const {
    int best = std::max(1, static_cast<int>(std::lround(wanted)));
    double least = std::numeric_limits<double>::infinity();
    for (int n = std::max(1, static_cast<int>(0.8 * wanted)); n <= 1.3 * wanted; ++n) {
        double cost = 0;
        for (const auto& e : ends_) {
            // Cells from the gas side of the cell to the segment; the normal is (az - bz, bx - ax).
            const double at = (0.5 * (e[0] + e[2]) - x_min_) / width_ * n,
                         part = at - std::floor(at);
            const double gap = e[1] > e[3] ? 1 - part : part;
            // On the edge itself it would count to the cell before as well.
            cost += std::fabs(e[3] - e[1]) / n * (gap < 1e-3 ? 1 : gap);
        }
        if (cost < least) {
            least = cost;
            best = n;
        }
    }
    return best;
}

int SegmentCaster::column(double x) const {
    return std::clamp(static_cast<int>(std::floor(x)), 0, nx_ - 1);
}
int SegmentCaster::row(double z) const {
    return std::clamp(static_cast<int>(std::floor(z)), 0, nz_ - 1);
}

/// Visits the cells, grown by `pad` on all sides, that an element crosses.
template <class Visit>
void SegmentCaster::visit_cells(int element, double pad, Visit visit) const {
    const auto& e = ends_[element];
    const double half = 0.5 + pad;
    const double ax = (e[0] - x_min_) * per_cell_x_, az = (e[1] - z_min_) * per_cell_z_;
    const double bx = (e[2] - x_min_) * per_cell_x_, bz = (e[3] - z_min_) * per_cell_z_;
    const double sx = bx - ax, sz = bz - az;
    const double reach = half * (std::fabs(sx) + std::fabs(sz));
    const int last_x = column(std::max(ax, bx) + pad), last_z = row(std::max(az, bz) + pad);
    for (int iz = row(std::min(az, bz) - pad); iz <= last_z; ++iz)
        for (int ix = column(std::min(ax, bx) - pad); ix <= last_x; ++ix) {
            const double off = sx * (iz + 0.5 - az) - sz * (ix + 0.5 - ax);
            if (std::fabs(off) <= reach) visit(static_cast<std::size_t>(iz) * nx_ + ix);
        }
}

/// For each cell that holds an element, all those in reach of it, in ascending order. Cells are
/// padded so that round-off in a ray's cell never hides a segment from it.
std::vector<std::vector<int>> SegmentCaster::list_elements() const {
    std::vector<std::vector<int>> lists(static_cast<std::size_t>(nx_) * nz_);
    std::vector<char> holds(lists.size(), 0);
    for (int e = 0; e < static_cast<int>(ends_.size()); ++e)
        visit_cells(e, cell_pad, [&](std::size_t cell) { holds[cell] = 1; });
    for (int e = 0; e < static_cast<int>(ends_.size()); ++e)
        visit_cells(e, list_reach, [&](std::size_t cell) {
            if (holds[cell]) lists[cell].push_back(e);
        });
    return lists;
}

void SegmentCaster::fill_cells(const std::vector<std::vector<int>>& lists, const Surface& surface) {
    content_.assign(lists.size(), nothing);
    for (std::size_t c = 0; c < lists.size(); ++c) {
        if (lists[c].empty()) continue;
        content_[c] = static_cast<int>(runs_.size());
        add_runs(lists[c], surface);
    }
}

SegmentCaster::Room SegmentCaster::room(const Rectangle& r) const {
    return {{x_min_ + r.x[0] * cell_x_, x_min_ + (r.x[1] + 1) * cell_x_},
            {z_min_ + r.z[0] * cell_z_, z_min_ + (r.z[1] + 1) * cell_z_},
            r,
            {{r.x[0] - 1, r.x[1] + 1}, {r.z[0] - 1, r.z[1] + 1}}};
}

/// Splits a cell's elements, in ascending order, into runs that share vertices.
void SegmentCaster::add_runs(const std::vector<int>& elements, const Surface& surface) {
    for (std::size_t i = 0; i < elements.size();) {
        std::size_t end = i + 1;
        while (end < elements.size() && end - i < run_length &&
               elements[end] == elements[end - 1] + 1 &&
               surface.corners[elements[end]][0] == surface.corners[elements[end - 1]][1])
            ++end;
        runs_.push_back(make_run(elements[i], static_cast<int>(end - i)));
        i = end;
    }
    runs_.back().last = true;
}

SegmentCaster::Run SegmentCaster::make_run(int first, int count) const {
    Run run;
    run.element = first;
    run.last = false;
    for (int k = 0; k < run_vertices; ++k) {
        const auto& e = ends_[first + std::min(k, count - 1)];
        run.x[k] = k < count ? e[0] : e[2];
        run.z[k] = k < count ? e[1] : e[3];
    }
    return run;
}

/// Sum of occupied cells over [0, ix) x [0, iz), row length nx + 1.
std::vector<int> SegmentCaster::occupancy_sums() const {
    const int stride = nx_ + 1;
    std::vector<int> sums(static_cast<std::size_t>(stride) * (nz_ + 1), 0);
    for (int iz = 0; iz < nz_; ++iz)
        for (int ix = 0; ix < nx_; ++ix) {
            const int c = iz * nx_ + ix;
            sums[(iz + 1) * stride + ix + 1] = occupied(c) + sums[iz * stride + ix + 1] +
                                               sums[(iz + 1) * stride + ix] -
                                               sums[iz * stride + ix];
        }
    return sums;
}

/// Empty cells, those farthest from any segment first (chessboard distance, two sweeps).
std::vector<int> SegmentCaster::cells_by_clearance() const {
    std::vector<int> clear(static_cast<std::size_t>(nx_) * nz_);
    const auto at = [&](int ix, int iz) {
        ix = std::clamp(ix, 0, nx_ - 1);
        return iz < 0 || iz >= nz_ ? nx_ + nz_ : clear[iz * nx_ + ix];
    };
    for (int c = 0; c < nx_ * nz_; ++c)
        clear[c] = occupied(c) ? 0 : nx_ + nz_;
    for (const int way : {1, -1})
        for (int n = 0; n < nx_ * nz_; ++n) {
            const int c = way > 0 ? n : nx_ * nz_ - 1 - n, ix = c % nx_, iz = c / nx_;
            clear[c] = std::min(clear[c], 1 + std::min({at(ix - way, iz), at(ix - 1, iz - way),
                                                        at(ix, iz - way), at(ix + 1, iz - way)}));
        }
    std::vector<int> order;
    for (int c = 0; c < nx_ * nz_; ++c)
        if (clear[c] > 0) order.push_back(c);
    std::stable_sort(order.begin(), order.end(), [&](int a, int b) { return clear[a] > clear[b]; });
    return order;
}

SegmentCaster::Rectangle SegmentCaster::grow(int ix, int iz, const std::vector<int>& sums) const {
    const int stride = nx_ + 1;
    Rectangle r{{ix, ix}, {iz, iz}};
    const auto empty = [&](int x0, int x1, int z0, int z1) {
        if (x0 < 0 || x1 >= nx_ || z0 < 0 || z1 >= nz_) return false;
        return sums[(z1 + 1) * stride + x1 + 1] - sums[z0 * stride + x1 + 1] -
                   sums[(z1 + 1) * stride + x0] + sums[z0 * stride + x0] ==
               0;
    };
    for (bool grew = true; grew;) {
        grew = false;
        if (empty(r.x[0] - 1, r.x[0] - 1, r.z[0], r.z[1])) --r.x[0], grew = true;
        if (empty(r.x[1] + 1, r.x[1] + 1, r.z[0], r.z[1])) ++r.x[1], grew = true;
        if (empty(r.x[0], r.x[1], r.z[0] - 1, r.z[0] - 1)) --r.z[0], grew = true;
        if (empty(r.x[0], r.x[1], r.z[1] + 1, r.z[1] + 1)) ++r.z[1], grew = true;
    }
    return r;
}

void SegmentCaster::find_rooms() {
    const std::vector<int> sums = occupancy_sums();
    for (const int c : cells_by_clearance()) {
        if (content_[c] != nothing) continue;
        const Rectangle r = grow(c % nx_, c / nx_, sums);
        const int content = -1 - static_cast<int>(rooms_.size());
        for (int iz = r.z[0]; iz <= r.z[1]; ++iz)
            for (int ix = r.x[0]; ix <= r.x[1]; ++ix)
                if (content_[iz * nx_ + ix] == nothing) content_[iz * nx_ + ix] = content;
        rooms_.push_back(room(r));
    }
}

/// The cells of a wall, which rays visit in no order, are brought together.
void SegmentCaster::lay_out_cells() {
    const bool deep = nz_ > nx_;
    next_x_ = deep ? nz_ + 2 : 1;
    next_z_ = deep ? 1 : nx_ + 2;
    const std::vector<int> rows = std::move(content_);
    content_.assign(static_cast<std::size_t>(nx_ + 2) * (nz_ + 2), outside);
    for (int iz = 0; iz < nz_; ++iz)
        for (int ix = 0; ix < nx_; ++ix)
            content_[(iz + 1) * next_z_ + (ix + 1) * next_x_] = rows[iz * nx_ + ix];
}

} // namespace rille::geometry
