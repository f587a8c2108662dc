// SPDX-License-Identifier: Apache-2.0
#include "geometry/band_topology.hpp"

#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>
#include <tbb/parallel_reduce.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <tuple>

namespace rille::geometry {

namespace {

constexpr std::size_t range_size = 4096;

bool before(const Band::Cell& a, const Band::Cell& b) {
    return std::tie(a.k, a.j, a.i) < std::tie(b.k, b.j, b.i);
}

bool same(const Band::Cell& a, const Band::Cell& b) {
    return a.i == b.i && a.j == b.j && a.k == b.k;
}

/// Where each row (k, j) starts in the sorted list of cells.
struct Rows {
    explicit Rows(const Band& band) : ny(band.domain.cells_y) {
        k_low = band.cells.front().k;
        k_high = band.cells.back().k;
        first.assign(static_cast<std::size_t>(k_high - k_low + 1) * ny + 1, 0);
        for (const Band::Cell& c : band.cells)
            ++first[row(c.k, c.j) + 1];
        for (std::size_t r = 1; r < first.size(); ++r)
            first[r] += first[r - 1];
    }
    std::size_t row(int k, int j) const { return static_cast<std::size_t>(k - k_low) * ny + j; }
    int ny, k_low, k_high;
    std::vector<int> first;
};

/// For each cell of row `from`, the cell with the same i in row `to`, written to side `side`.
void join_rows(Band& band, const Rows& rows, std::size_t from, std::size_t to, int side) {
    int t = rows.first[to];
    const int t_end = rows.first[to + 1];
    for (int c = rows.first[from]; c < rows.first[from + 1]; ++c) {
        const int i = band.cells[c].i;
        while (t < t_end && band.cells[t].i < i)
            ++t;
        band.neighbour[c][side] = t < t_end && band.cells[t].i == i ? t : -1;
    }
}

void connect_within_row(Band& band, int begin, int end) {
    const int nx = band.domain.cells_x;
    const bool mirror = band.domain.sides == Sides::mirror;
    for (int c = begin; c < end; ++c) {
        const int i = band.cells[c].i;
        auto& n = band.neighbour[c];
        n[0] = c > begin && band.cells[c - 1].i == i - 1 ? c - 1 : -1;
        n[1] = c + 1 < end && band.cells[c + 1].i == i + 1 ? c + 1 : -1;
        if (i == 0) n[0] = mirror ? c : (band.cells[end - 1].i == nx - 1 ? end - 1 : -1);
        if (i == nx - 1) n[1] = mirror ? c : (band.cells[begin].i == 0 ? begin : -1);
    }
}

/// One axis of the upwind eikonal equation: slope along it = weight (u - at) / h.
struct UpwindTerm {
    double least = 0; ///< |phi| of the upwind neighbour
    double at = 0, weight = 1;
};

/// The upwind neighbour of c along an axis, with the second one where it continues the descent.
bool upwind_term(const Band& band, std::size_t c, int axis, double unknown, UpwindTerm& term) {
    const double sign = band.phi[c] < 0 ? -1 : 1;
    int best = -1;
    for (int side = 2 * axis; side < 2 * axis + 2; ++side) {
        const int m = band.neighbour[c][side];
        if (m < 0 || m == static_cast<int>(c)) continue;
        if (best < 0 || sign * band.phi[m] < sign * band.phi[band.neighbour[c][best]]) best = side;
    }
    if (best < 0) return false;
    const int first = band.neighbour[c][best], second = band.neighbour[first][best];
    const double u = std::max(0.0, sign * band.phi[first]);
    if (u >= unknown) return false;
    term = {u, u, 1};
    if (second < 0 || sign * band.phi[second] > u) return true;
    term.at = (4 * sign * band.phi[first] - sign * band.phi[second]) / 3;
    term.weight = 1.5;
    return true;
}

/// |phi| of a cell by the second-order upwind eikonal equation (fast marching's differences) from
/// its neighbours on the same side; exact for planes once all upwind neighbours are known.
double eikonal(const Band& band, std::size_t c, double unknown) {
    const double h = band.domain.spacing;
    UpwindTerm terms[3];
    int n = 0;
    for (int axis = 0; axis < 3; ++axis) {
        UpwindTerm term;
        if (!upwind_term(band, c, axis, unknown, term)) continue;
        int at = n++; // kept in rising order
        for (; at > 0 && terms[at - 1].least > term.least; --at)
            terms[at] = terms[at - 1];
        terms[at] = term;
    }
    double u = unknown, square = 0, linear = 0, constant = -h * h;
    for (int m = 0; m < n && u > terms[m].least; ++m) {
        const double w = terms[m].weight * terms[m].weight;
        square += w;
        linear += w * terms[m].at;
        constant += w * terms[m].at * terms[m].at;
        const double root = linear * linear - square * constant;
        if (root < 0) break;
        u = (linear + std::sqrt(root)) / square;
    }
    // Never 0: a new cell keeps its side.
    return std::max({u, n > 0 ? terms[0].least : u, 1e-3 * h});
}

/// Steps (0 to 2, else 3) from each cell to the nearest one whose neighbour has the other sign.
/// Contouring needs all cells within two steps, whatever phi says where it is no distance.
std::vector<char> steps_to_contour(const Band& band) {
    std::vector<char> steps(band.size(), 3);
    if (band.domain.extruded()) return steps;
    for (int step = 0; step < 3; ++step) {
        const std::vector<char> before = steps;
        for_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
            for (std::size_t c = begin; c < end; ++c)
                for (const int n : band.neighbour[c])
                    if (n >= 0 && before[c] == 3 &&
                        (step == 0 ? (band.phi[n] < 0) != (band.phi[c] < 0)
                                   : before[n] == step - 1))
                        steps[c] = static_cast<char>(step);
        });
    }
    return steps;
}

/// Missing neighbours of cells within the half-width, sorted, with the sign of the cell they touch.
std::vector<std::pair<Band::Cell, double>> missing_cells(const Band& band, double reach) {
    static constexpr int step[6][3] = {{-1, 0, 0}, {1, 0, 0},  {0, -1, 0},
                                       {0, 1, 0},  {0, 0, -1}, {0, 0, 1}};
    const Domain& d = band.domain;
    const std::vector<char> steps = steps_to_contour(band);
    std::vector<std::pair<Band::Cell, double>> out;
    for (std::size_t c = 0; c < band.size(); ++c) {
        if (std::fabs(band.phi[c]) > reach && steps[c] > 1) continue;
        for (int side = 0; side < 6; ++side) {
            if (band.neighbour[c][side] >= 0 || (d.extruded() && (side == 2 || side == 3)))
                continue;
            const Band::Cell& from = band.cells[c];
            out.push_back(
                {{fold_index(from.i + step[side][0], d.cells_x, d.sides),
                  fold_index(from.j + step[side][1], d.cells_y, d.sides), from.k + step[side][2]},
                 band.phi[c] < 0 ? -1.0 : 1.0});
        }
    }
    std::sort(out.begin(), out.end(),
              [](const auto& a, const auto& b) { return before(a.first, b.first); });
    out.erase(std::unique(out.begin(), out.end(),
                          [](const auto& a, const auto& b) { return same(a.first, b.first); }),
              out.end());
    return out;
}

/// Adds one layer of cells around those within `reach` and gives it eikonal values. Returns whether
/// there was any to add.
bool add_layer(Band& band, double reach) {
    const auto fresh = missing_cells(band, reach);
    if (fresh.empty()) return false;
    const double unknown = 4 * reach;
    Band grown;
    grown.domain = band.domain;
    grown.cells.reserve(band.size() + fresh.size());
    grown.phi.reserve(band.size() + fresh.size());
    std::vector<int> added;
    added.reserve(fresh.size());
    std::size_t f = 0;
    const auto add = [&] {
        added.push_back(static_cast<int>(grown.cells.size()));
        grown.cells.push_back(fresh[f].first);
        grown.phi.push_back(fresh[f].second * unknown);
        ++f;
    };
    for (std::size_t c = 0; c < band.size(); ++c) {
        while (f < fresh.size() && before(fresh[f].first, band.cells[c]))
            add();
        grown.cells.push_back(band.cells[c]);
        grown.phi.push_back(band.phi[c]);
    }
    while (f < fresh.size())
        add();
    connect(grown);
    // Upwind neighbours within the layer itself settle in as many rounds as chains are long.
    std::vector<double> value(added.size());
    for (int round = 0; round < 4; ++round) {
        for_ranges(added.size(), [&](std::size_t begin, std::size_t end) {
            for (std::size_t a = begin; a < end; ++a)
                value[a] = eikonal(grown, added[a], unknown);
        });
        bool settled = true;
        for (std::size_t a = 0; a < added.size(); ++a) {
            double& phi = grown.phi[added[a]];
            settled = settled && std::fabs(phi) == value[a];
            phi = std::copysign(value[a], phi);
        }
        if (settled) break;
    }
    band = std::move(grown);
    return !band.domain.extruded() || std::any_of(added.begin(), added.end(), [&](int c) {
        return std::fabs(band.phi[c]) <= reach;
    });
}

} // namespace

void for_ranges(std::size_t n, const std::function<void(std::size_t, std::size_t)>& body) {
    if (n <= range_size) return body(0, n);
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, (n + range_size - 1) / range_size, 1),
                      [&](const tbb::blocked_range<std::size_t>& r) {
                          for (std::size_t b = r.begin(); b < r.end(); ++b)
                              body(b * range_size, std::min(n, (b + 1) * range_size));
                      });
}

double largest_of_ranges(std::size_t n,
                         const std::function<double(std::size_t, std::size_t)>& body) {
    if (n <= range_size) return std::max(0.0, body(0, n));
    return tbb::parallel_reduce(
        tbb::blocked_range<std::size_t>(0, (n + range_size - 1) / range_size, 1), 0.0,
        [&](const tbb::blocked_range<std::size_t>& r, double most) {
            for (std::size_t b = r.begin(); b < r.end(); ++b)
                most = std::max(most, body(b * range_size, std::min(n, (b + 1) * range_size)));
            return most;
        },
        [](double a, double b) { return std::max(a, b); });
}

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

int ColumnIndex::find(const Band& band, int i, int j, int k) const {
    const auto [begin, end] = column(band, i, j);
    const int* at = std::lower_bound(begin, end, k,
                                     [&](int c, int wanted) { return band.cells[c].k < wanted; });
    return at != end && band.cells[*at].k == k ? *at : -1;
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

std::size_t ColumnIndex::memory_bytes() const {
    return (first_.capacity() + cell_.capacity()) * sizeof(int);
}

void connect(Band& band) {
    RILLE_CHECK(!band.cells.empty(), "an empty band has no front");
    const Rows rows(band);
    const Domain& d = band.domain;
    band.neighbour.resize(band.size());
    const auto joined = [&](std::size_t begin, std::size_t end) {
        for (std::size_t r = begin; r < end; ++r) {
            const int k = rows.k_low + static_cast<int>(r / rows.ny);
            const int j = static_cast<int>(r % rows.ny);
            const int first = rows.first[r], last = rows.first[r + 1];
            if (first == last) continue;
            connect_within_row(band, first, last);
            for (int up = 0; up < 2; ++up) {
                const int side_y = 2 + up, side_z = 4 + up, to_j = up ? j + 1 : j - 1;
                const int to_k = up ? k + 1 : k - 1;
                if (d.extruded())
                    for (int c = first; c < last; ++c)
                        band.neighbour[c][side_y] = -1;
                else
                    join_rows(band, rows, r, rows.row(k, fold_index(to_j, rows.ny, d.sides)),
                              side_y);
                if (to_k >= rows.k_low && to_k <= rows.k_high)
                    join_rows(band, rows, r, rows.row(to_k, j), side_z);
                else
                    for (int c = first; c < last; ++c)
                        band.neighbour[c][side_z] = -1;
            }
        }
    };
    tbb::parallel_for(
        tbb::blocked_range<std::size_t>(0, rows.first.size() - 1, 64),
        [&](const tbb::blocked_range<std::size_t>& r) { joined(r.begin(), r.end()); });
}

void retopologise(Band& band, int layers) {
    const double reach = band_half_width * band.domain.spacing;
    for (int layer = 0; layer < layers && add_layer(band, reach); ++layer) {
    }
    const std::vector<char> steps = steps_to_contour(band);
    std::size_t kept = 0;
    for (std::size_t c = 0; c < band.size(); ++c) {
        if (std::fabs(band.phi[c]) > reach && steps[c] > 2) continue;
        band.cells[kept] = band.cells[c];
        band.phi[kept++] = band.phi[c];
    }
    band.cells.resize(kept);
    band.phi.resize(kept);
    connect(band);
}

bool contour_lacks_cells(const Band& band) {
    if (band.domain.extruded()) return false;
    const std::vector<char> steps = steps_to_contour(band);
    for (std::size_t c = 0; c < band.size(); ++c)
        if (steps[c] <= 1)
            for (const int n : band.neighbour[c])
                if (n < 0) return true;
    return false;
}

double edge_distance(const Band& band) {
    const bool flat = band.domain.extruded();
    const double far = 1e3 * band_half_width * band.domain.spacing;
    return far - largest_of_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
               double most = 0;
               for (std::size_t c = begin; c < end; ++c) {
                   const auto& n = band.neighbour[c];
                   const bool inner = n[0] >= 0 && n[1] >= 0 && n[4] >= 0 && n[5] >= 0 &&
                                      (flat || (n[2] >= 0 && n[3] >= 0));
                   if (!inner) most = std::max(most, far - std::fabs(band.phi[c]));
               }
               return most;
           });
}

} // namespace rille::geometry
