// SPDX-License-Identifier: Apache-2.0
#include "geometry/band_topology.hpp"

#include "geometry/check.hpp"
#include "geometry/ranges.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>
#include <tbb/parallel_reduce.h>
#include <tbb/parallel_sort.h>

#include <algorithm>
#include <cmath>
#include <cstdint>

namespace rille::geometry {

namespace {

/// [cells] the eikonal value of a cell is at least its least neighbour's plus this: slope 1 shared
/// by three axes, each with a weight of 1.5.
constexpr double least_rise = 0.38;

bool has_gap(const std::array<int, 6>& next, bool flat) {
    return (next[0] | next[1] | next[4] | next[5]) < 0 || (!flat && (next[2] | next[3]) < 0);
}

/// Links the cells of two neighbouring rows that have the same i: those of `below` on side `up`,
/// those of `above` on side `up` - 1.
void join_rows(Band& band, const RowIndex& rows, std::size_t below, std::size_t above, int up) {
    int b = rows.first(below), a = rows.first(above);
    const int b_end = rows.first(below + 1), a_end = rows.first(above + 1);
    while (b < b_end && a < a_end) {
        const int apart = band.cells[b].i - band.cells[a].i;
        if (apart == 0) {
            band.neighbour[b][up] = a;
            band.neighbour[a][up - 1] = b;
        }
        b += apart <= 0;
        a += apart >= 0;
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

/// Makes each cell its own neighbour.
void mirror_row(Band& band, int begin, int end, int side) {
    for (int c = begin; c < end; ++c)
        band.neighbour[c][side] = c;
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

/// Marks the cells with a neighbour of the other sign. Only contouring in three dimensions asks.
RawVector<char> beside_contour(const Band& band) {
    RawVector<char> beside(band.size());
    const bool flat = band.domain.planar_contour();
    for_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            beside[c] = 0;
            for (const int n : band.neighbour[c])
                if (!flat && n >= 0 && (band.phi[n] < 0) != (band.phi[c] < 0)) beside[c] = 1;
        }
    });
    return beside;
}

/// Whether a marked cell lies within `steps` of c. Contouring needs all cells within two steps,
/// whatever phi says where it is no distance.
bool within_steps(const Band& band, const RawVector<char>& beside, int c, int steps) {
    if (beside[c]) return true;
    if (steps == 0) return false;
    for (const int n : band.neighbour[c])
        if (n >= 0 && within_steps(band, beside, n, steps - 1)) return true;
    return false;
}

/// A cell to add as one number: its place in the order of the band, then the side of the contour of
/// the cell it touches.
using Fresh = std::uint64_t;

/// Cells as numbers that rise in the order of the band, and back.
class Order {
public:
    explicit Order(const Band& band)
        : nx_(band.domain.cells_x), ny_(band.domain.cells_y), k_low_(band.cells.front().k - 1) {}
    Fresh fresh(const Band::Cell& c, bool gas) const {
        return ((static_cast<Fresh>(c.k - k_low_) * ny_ + c.j) * nx_ + c.i) << 1 | gas;
    }
    Band::Cell cell(Fresh f) const {
        const Fresh row = (f >> 1) / nx_;
        return {static_cast<int>((f >> 1) % nx_), static_cast<int>(row % ny_),
                static_cast<int>(row / ny_) + k_low_};
    }

private:
    Fresh nx_, ny_;
    int k_low_;
};

/// Missing neighbours of those of the cells from(0) to from(count - 1) that are within `reach` or
/// one step from the contour.
template <class From>
std::vector<Fresh> missing_cells(const Band& band, const RawVector<char>& beside, double reach,
                                 std::size_t count, const From& from) {
    static constexpr int step[6][3] = {{-1, 0, 0}, {1, 0, 0},  {0, -1, 0},
                                       {0, 1, 0},  {0, 0, -1}, {0, 0, 1}};
    const Domain& d = band.domain;
    const bool flat = d.planar_contour();
    const Order order(band);
    std::vector<std::vector<Fresh>> parts(range_of(count) + 1);
    for_ranges(count, [&](std::size_t begin, std::size_t end) {
        std::vector<Fresh>& out = parts[range_of(begin)];
        for (std::size_t at = begin; at < end; ++at) {
            const int c = from(at);
            const auto& next = band.neighbour[c];
            if (!has_gap(next, flat)) continue;
            if (std::fabs(band.phi[c]) > reach && !within_steps(band, beside, c, 1)) continue;
            for (int side = 0; side < 6; ++side) {
                if (next[side] >= 0 || (flat && (side == 2 || side == 3))) continue;
                const Band::Cell& cell = band.cells[c];
                out.push_back(order.fresh({fold_index(cell.i + step[side][0], d.cells_x, d.sides),
                                           fold_index(cell.j + step[side][1], d.cells_y, d.sides),
                                           cell.k + step[side][2]},
                                          band.phi[c] >= 0));
            }
        }
    });
    std::vector<Fresh> all;
    for (const std::vector<Fresh>& part : parts)
        all.insert(all.end(), part.begin(), part.end());
    tbb::parallel_sort(all.begin(), all.end());
    all.erase(
        std::unique(all.begin(), all.end(), [](Fresh a, Fresh b) { return a >> 1 == b >> 1; }),
        all.end());
    return all;
}

/// Puts cells in where they belong, with phi = `unknown` on their side; returns where they are.
std::vector<int> insert(Band& band, RawVector<char>& beside, const std::vector<Fresh>& fresh,
                        double unknown) {
    const std::size_t old = band.size(), size = old + fresh.size();
    const Order order(band);
    RawVector<Band::Cell> cells(size);
    RawVector<double> phi(size);
    RawVector<char> marks(size);
    std::vector<int> added(fresh.size());
    const auto first_after = [&](std::size_t c) {
        return std::lower_bound(fresh.begin(), fresh.end(), order.fresh(band.cells[c], false)) -
               fresh.begin();
    };
    for_ranges(old, [&](std::size_t begin, std::size_t end) {
        std::size_t f = begin == 0 ? 0 : first_after(begin);
        const std::size_t f_end = end == old ? fresh.size() : first_after(end);
        for (std::size_t c = begin, to = begin + f; c < end || f < f_end; ++to) {
            if (f < f_end && (c == end || fresh[f] < order.fresh(band.cells[c], false))) {
                cells[to] = order.cell(fresh[f]);
                phi[to] = fresh[f] & 1 ? unknown : -unknown;
                marks[to] = 0;
                added[f++] = static_cast<int>(to);
            } else {
                cells[to] = band.cells[c];
                phi[to] = band.phi[c];
                marks[to] = beside[c++];
            }
        }
    });
    band.cells.swap(cells);
    band.phi.swap(phi);
    beside.swap(marks);
    connect(band);
    if (band.domain.planar_contour()) return added;
    const auto other_side = [&](int c, int n) {
        return n >= 0 && (band.phi[n] < 0) != (band.phi[c] < 0);
    };
    for (const int a : indices_where(added.size(), [&](std::size_t at) {
             const auto& next = band.neighbour[added[at]];
             return std::any_of(next.begin(), next.end(),
                                [&](int n) { return other_side(added[at], n); });
         })) {
        const int c = added[a];
        beside[c] = 1;
        for (const int n : band.neighbour[c])
            if (other_side(c, n)) beside[n] = 1;
    }
    return added;
}

/// Eikonal values for added cells. Upwind neighbours among themselves settle in as many rounds as
/// chains are long.
void solve(Band& band, const std::vector<int>& added, double unknown) {
    RawVector<double> value(added.size());
    std::vector<char> news(band.size(), 0);
    const auto hears_news = [&](int c) {
        for (int side = 0; side < 6; ++side) {
            const int n = band.neighbour[c][side], beyond = n < 0 ? -1 : band.neighbour[n][side];
            if (n >= 0 && (news[n] || (beyond >= 0 && news[beyond]))) return true;
        }
        return false;
    };
    for (int round = 0; round < 4; ++round) {
        for_ranges(added.size(), [&](std::size_t begin, std::size_t end) {
            for (std::size_t a = begin; a < end; ++a)
                value[a] = round == 0 || hears_news(added[a]) ? eikonal(band, added[a], unknown)
                                                              : std::fabs(band.phi[added[a]]);
        });
        const double changed =
            largest_of_ranges(added.size(), [&](std::size_t begin, std::size_t end) {
                bool any = false;
                for (std::size_t a = begin; a < end; ++a) {
                    double& phi = band.phi[added[a]];
                    news[added[a]] = std::fabs(phi) != value[a];
                    any = any || news[added[a]];
                    phi = std::copysign(value[a], phi);
                }
                return any ? 1.0 : 0.0;
            });
        if (changed == 0) break;
    }
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

void connect(Band& band) {
    RILLE_CHECK(!band.cells.empty(), "an empty band has no front");
    const RowIndex rows(band);
    const Domain& d = band.domain;
    const int ny = d.cells_y;
    band.neighbour.resize(band.size());
    const auto over_rows = [&](const auto& body) {
        over_ranges(rows.rows(), 64, [&](std::size_t begin, std::size_t end) {
            for (std::size_t row = begin; row < end; ++row)
                body(row);
        });
    };
    over_rows([&](std::size_t row) {
        for (int c = rows.first(row); c < rows.first(row + 1); ++c)
            band.neighbour[c].fill(-1);
        connect_within_row(band, rows.first(row), rows.first(row + 1));
    });
    over_rows([&](std::size_t row) { // each links itself to the rows after it
        const int j = static_cast<int>(row % ny);
        if (row + ny < rows.rows()) join_rows(band, rows, row, row + ny, 5);
        if (d.planar_contour()) return;
        if (j + 1 < ny) return join_rows(band, rows, row, row + 1, 3);
        if (d.sides == Sides::periodic) return join_rows(band, rows, row, row - j, 3);
        mirror_row(band, rows.first(row), rows.first(row + 1), 3);
    });
    if (d.planar_contour() || d.sides == Sides::periodic) return;
    for (std::size_t row = 0; row < rows.rows(); row += ny)
        mirror_row(band, rows.first(row), rows.first(row + 1), 2);
}

void retopologise(Band& band, int layers) {
    const double reach = band_half_width * band.domain.spacing, unknown = 4 * reach;
    // A cell of more than this has no missing neighbour within the half-width: see least_rise.
    const double inner = reach - least_rise * band.domain.spacing;
    RawVector<char> beside = beside_contour(band);
    std::vector<int> added;
    for (int layer = 0; layer < layers; ++layer) {
        // After the first layer only what it added can lack neighbours.
        const std::vector<Fresh> fresh =
            layer == 0 ? missing_cells(band, beside, inner, band.size(),
                                       [](std::size_t c) { return static_cast<int>(c); })
                       : missing_cells(band, beside, inner, added.size(),
                                       [&](std::size_t a) { return added[a]; });
        if (fresh.empty()) break;
        added = insert(band, beside, fresh, unknown);
        solve(band, added, unknown);
    }
    const std::vector<int> kept = indices_where(band.size(), [&](std::size_t c) {
        return !(std::fabs(band.phi[c]) > reach) ||
               within_steps(band, beside, static_cast<int>(c), 2);
    });
    if (kept.size() == band.size()) return;
    RawVector<Band::Cell> cells(kept.size());
    RawVector<double> phi(kept.size());
    for_ranges(kept.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t at = begin; at < end; ++at) {
            cells[at] = band.cells[kept[at]];
            phi[at] = band.phi[kept[at]];
        }
    });
    band.cells.swap(cells);
    band.phi.swap(phi);
    connect(band);
}

bool contour_lacks_cells(const Band& band) {
    if (band.domain.planar_contour()) return false;
    const RawVector<char> beside = beside_contour(band);
    return largest_of_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
               for (std::size_t c = begin; c < end; ++c)
                   if (has_gap(band.neighbour[c], false) &&
                       within_steps(band, beside, static_cast<int>(c), 1))
                       return 1.0;
               return 0.0;
           }) > 0;
}

double edge_distance(const Band& band) {
    const bool flat = band.domain.planar_contour();
    const double far = 1e3 * band_half_width * band.domain.spacing;
    return far - largest_of_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
               double most = 0;
               for (std::size_t c = begin; c < end; ++c) {
                   if (has_gap(band.neighbour[c], flat))
                       most = std::max(most, far - std::fabs(band.phi[c]));
               }
               return most;
           });
}

} // namespace rille::geometry
