// SPDX-License-Identifier: Apache-2.0
#include "geometry/band_topology.hpp"

#include <algorithm>

namespace rille::geometry {

int fold_index(int i, int count, Sides sides) {
    if (i >= 0 && i < count) return i;
    const int period = sides == Sides::mirror ? 2 * count : count;
    const int m = ((i % period) + period) % period;
    return m < count ? m : period - 1 - m;
}

void ColumnIndex::build(const Band& band) {
    const Domain& d = band.domain;
    first_.assign(static_cast<std::size_t>(d.cells_x) * d.cells_y + 1, 0);
    const auto column = [&](const Band::Cell& c) {
        return c.i + static_cast<std::size_t>(d.cells_x) * c.j;
    };
    for (const Band::Cell& c : band.cells)
        ++first_[column(c) + 1];
    for (std::size_t c = 1; c < first_.size(); ++c)
        first_[c] += first_[c - 1];
    std::vector<int> at(first_.begin(), first_.end() - 1);
    cell_.resize(band.size());
    for (std::size_t c = 0; c < band.size(); ++c)
        cell_[at[column(band.cells[c])]++] = static_cast<int>(c);
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
    first_.assign(static_cast<std::size_t>(k_high_ - k_low_ + 1) * ny_ + 1, 0);
    for (const Band::Cell& c : band.cells)
        ++first_[row(c.k, c.j) + 1];
    for (std::size_t r = 1; r < first_.size(); ++r)
        first_[r] += first_[r - 1];
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
