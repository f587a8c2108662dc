// SPDX-License-Identifier: Apache-2.0
#include "geometry/band_topology.hpp"

#include "geometry/ranges.hpp"

#include <algorithm>
#include <numeric>

namespace rille::geometry {

int fold_index(int i, int count, Sides sides) {
    if (i >= 0 && i < count) return i;
    const int period = sides == Sides::mirror ? 2 * count : count;
    const int m = ((i % period) + period) % period;
    return m < count ? m : period - 1 - m;
}

void ColumnIndex::build(const Band& band) {
    const int nx = band.domain.cells_x, ny = band.domain.cells_y;
    const RowIndex rows(band);
    first_.assign(static_cast<std::size_t>(nx) * ny + 1, 0);
    cell_.resize(band.size());
    const auto over_cells = [&](const auto& visit) { // the columns of one j at a time
        over_ranges(ny, 4, [&](std::size_t begin, std::size_t end) {
            for (std::size_t row = 0; row < rows.rows(); row += ny)
                for (std::size_t j = begin; j < end; ++j)
                    for (int c = rows.first(row + j); c < rows.first(row + j + 1); ++c)
                        visit(j * nx + band.cells[c].i, c);
        });
    };
    over_cells([&](std::size_t column, int) { ++first_[column + 1]; });
    std::partial_sum(first_.begin(), first_.end(), first_.begin());
    std::vector<int> at(first_.begin(), first_.end() - 1);
    over_cells([&](std::size_t column, int c) { cell_[at[column]++] = c; });
}

std::pair<const int*, const int*> ColumnIndex::column(const Band& band, int i, int j) const {
    const std::size_t c = i + static_cast<std::size_t>(band.domain.cells_x) * j;
    return {cell_.data() + first_[c], cell_.data() + first_[c + 1]};
}

double ColumnIndex::phi(const Band& band, int i, int j, int k) const {
    const auto [begin, end] = column(band, i, j);
    const double beyond = band_half_width * band.domain.spacing;
    const int* at = std::lower_bound(begin, end, k,
                                     [&](int c, int wanted) { return band.cells[c].k < wanted; });
    if (at == end) return beyond;
    if (band.cells[*at].k == k) return std::clamp(band.phi[*at], -beyond, beyond);
    return at == begin || band.phi[*at] < 0 ? -beyond : beyond;
}

RowIndex::RowIndex(const Band& band)
    : band_(band), ny_(band.domain.cells_y), k_low_(band.cells.front().k),
      k_high_(band.cells.back().k) {
    const std::size_t rows = static_cast<std::size_t>(k_high_ - k_low_ + 1) * ny_;
    first_.resize(rows + 1);
    // Each cell that starts a row says so, for the empty rows before it as well.
    for_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const std::size_t own = row(band.cells[c].k, band.cells[c].j);
            std::size_t r = c == 0 ? 0 : row(band.cells[c - 1].k, band.cells[c - 1].j) + 1;
            for (; r <= own; ++r)
                first_[r] = static_cast<int>(c);
        }
    });
    const Band::Cell& last = band.cells.back();
    std::fill(first_.begin() + row(last.k, last.j) + 1, first_.end(),
              static_cast<int>(band.size()));
}

int RowIndex::find(int i, int j, int k) const {
    if (k < k_low_ || k > k_high_) return -1;
    const std::size_t r = row(k, j);
    const auto begin = band_.cells.begin() + first_[r], end = band_.cells.begin() + first_[r + 1];
    const auto at = std::lower_bound(begin, end, i,
                                     [](const Band::Cell& c, int wanted) { return c.i < wanted; });
    return at != end && at->i == i ? static_cast<int>(at - band_.cells.begin()) : -1;
}

std::size_t ColumnIndex::memory_bytes() const {
    return (first_.capacity() + cell_.capacity()) * sizeof(int);
}

} // namespace rille::geometry
