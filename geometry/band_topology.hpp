// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"

#include <cstddef>
#include <functional>
#include <utility>
#include <vector>

namespace rille::geometry {

/// Half-width of the band [cells]: the stencil of a cell next to the contour reaches this far.
constexpr double band_half_width = 3.0;

/// Calls body(begin, end) for consecutive ranges of [0, n), in parallel. The ranges depend on n
/// alone; bodies must write disjoint outputs only, so results do not depend on the thread count.
void for_ranges(std::size_t n, const std::function<void(std::size_t, std::size_t)>& body);
constexpr std::size_t range_size = 4096;
/// Which of these ranges holds an index.
constexpr std::size_t range_of(std::size_t index) {
    return index / range_size;
}
/// Largest of body(begin, end) over the same ranges (exact for any thread count), at least 0.
double largest_of_ranges(std::size_t n,
                         const std::function<double(std::size_t, std::size_t)>& body);

/// Indices of [0, n) for which wanted(index) holds, in ascending order; asked in parallel.
template <class Wanted>
std::vector<int> indices_where(std::size_t n, const Wanted& wanted) {
    std::vector<std::vector<int>> parts(range_of(n) + 1);
    for_ranges(n, [&](std::size_t begin, std::size_t end) {
        for (std::size_t at = begin; at < end; ++at)
            if (wanted(at)) parts[range_of(begin)].push_back(static_cast<int>(at));
    });
    std::vector<int> all;
    for (const std::vector<int>& part : parts)
        all.insert(all.end(), part.begin(), part.end());
    return all;
}

/// Reads phi by indices: per column (i, j) the numbers of its cells by rising k. Every
/// column crosses the front, so the nearest cell of a column also tells the sign beyond the band.
class ColumnIndex {
public:
    void build(const Band&);
    /// phi [nm] of node (i, j, k); outside the band +-(half-width) by the side it is on.
    double phi(const Band&, int i, int j, int k) const;
    std::size_t memory_bytes() const;

private:
    std::pair<const int*, const int*> column(const Band&, int i, int j) const;
    std::vector<int> first_;
    std::vector<int> cell_;
};

/// Finds cells row by row (k, j): quick to build, for many look-ups at once. The band must outlive
/// it.
class RowIndex {
public:
    explicit RowIndex(const Band&);
    /// Number of cell (i, j, k), or -1 outside the band; 0 <= i < cells_x, 0 <= j < cells_y.
    int find(int i, int j, int k) const;
    int k_low() const { return k_low_; }
    int k_high() const { return k_high_; }
    std::size_t rows() const { return first_.size() - 1; }
    std::size_t row(int k, int j) const { return static_cast<std::size_t>(k - k_low_) * ny_ + j; }
    int first(std::size_t row) const { return first_[row]; } ///< cells [first(row), first(row + 1))

private:
    const Band& band_;
    int ny_, k_low_, k_high_;
    std::vector<int> first_;
};

/// Index of a node beyond the sides: mirrored or wrapped back into [0, count).
int fold_index(int i, int count, Sides sides);

/// Fills band.neighbour from band.cells (sorted by k, j, i) and the domain.
void connect(Band& band);

/// Drops cells farther than the half-width from the contour and adds missing ones, `layers` times;
/// new values come from the eikonal equation with the old ones as boundary values.
void retopologise(Band& band, int layers);

/// full: whether a cell that contouring needs (within two steps of the contour, diagonals included)
/// is missing from the band. Never in extruded.
bool contour_lacks_cells(const Band& band);

/// Smallest |phi| [nm] among cells with a missing neighbour: how near the contour came to the edge.
double edge_distance(const Band& band);

} // namespace rille::geometry
