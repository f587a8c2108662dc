// SPDX-License-Identifier: Apache-2.0
#include "geometry/contour.hpp"
#include "geometry/mirror_side.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

/// Points are keyed by the grid edge they cross: edges of cell c are 4c (to +x), 4c + 1 (to +z),
/// and at a mirror side 4c + 2 (from c to the side plane), 4c + 3 (along the side plane to +z).
/// A one-cell-wide mirror domain has two sides per cell; its right side uses keys behind 4 size.
class Marcher {
public:
    explicit Marcher(const Band& band)
        : band_(band), h_(band.domain.spacing), mirror_(band.domain.sides == Sides::mirror),
          after_(8 * band.size(), -1), step_(8 * band.size(), 0), has_before_(8 * band.size(), 0) {}

    std::vector<ContourChain> run() {
        const int last = band_.domain.cells_x - 1;
        for (int c = 0; c < static_cast<int>(band_.size()); ++c) {
            const int up = band_.neighbour[c][5];
            if (up < 0) continue;
            const int i = band_.cells[c].i;
            if (!mirror_ || i < last) inner_cell(c, up);
            if (mirror_ && i == 0) side_cell(c, up, -1);
            if (mirror_ && i == last) side_cell(c, up, +1);
        }
        return collect();
    }

private:
    /// Value on the mirror side plane next to outermost cell c.
    double side_value(int c, int side) const {
        return band_.phi[c] + change_to_side(band_, c, 0, side < 0);
    }

    void inner_cell(int c, int up) {
        const int right = band_.neighbour[c][1];
        const int diagonal = band_.neighbour[up][1];
        if (right < 0 || diagonal < 0) return;
        const bool wraps = band_.cells[right].i <= band_.cells[c].i;
        const double phi[4] = {band_.phi[c], band_.phi[right], band_.phi[diagonal], band_.phi[up]};
        const int key[4] = {4 * c, 4 * right + 1, 4 * up, 4 * c + 1};
        march(phi, key, wraps);
    }

    void side_cell(int c, int up, int side) {
        const double here = side_value(c, side), above = side_value(up, side);
        const int base = side < 0 ? 0 : 4 * static_cast<int>(band_.size());
        const int along = base + 4 * c + 3, low = base + 4 * c + 2, high = base + 4 * up + 2;
        if (side < 0) {
            const double phi[4] = {here, band_.phi[c], band_.phi[up], above};
            const int key[4] = {low, 4 * c + 1, high, along};
            march(phi, key, false);
        } else {
            const double phi[4] = {band_.phi[c], here, above, band_.phi[up]};
            const int key[4] = {low, along, high, 4 * c + 1};
            march(phi, key, false);
        }
    }

    /// Corners anticlockwise from the lower left; edge m joins corner m and m + 1. A segment enters
    /// through an edge and leaves through another with the gas on its left.
    void march(const double (&phi)[4], const int (&key)[4], bool wraps) {
        int enters[2], leaves[2], in = 0, out = 0;
        for (int m = 0; m < 4; ++m) {
            const bool gas = phi[m] >= 0, gas_next = phi[(m + 1) % 4] >= 0;
            if (gas == gas_next) continue;
            // Going anticlockwise the interior lies to the left, so the path inwards through an
            // edge has the edge's start on its left.
            if (gas)
                enters[in++] = m;
            else
                leaves[out++] = m;
        }
        if (in == 0) return;
        if (in == 1) return join(key, enters[0], leaves[0], wraps);
        const bool gas_joined = phi[0] + phi[1] + phi[2] + phi[3] >= 0;
        // Joined gas: the segment goes round the solid corner at the end of the entered edge.
        for (int m = 0; m < 2; ++m) {
            const int partner = gas_joined ? (enters[m] + 1) % 4 : (enters[m] + 3) % 4;
            join(key, enters[m], partner, wraps);
        }
    }

    void join(const int (&key)[4], int from, int to, bool wraps) {
        after_[key[from]] = key[to];
        has_before_[key[to]] = 1;
        // Only edge 1 lies in the next period when the cell wraps.
        step_[key[from]] = wraps ? (to == 1) - (from == 1) : 0;
    }

    Vec3 point(int key) const {
        const int base = 4 * static_cast<int>(band_.size());
        const int side = key < base ? -1 : 1;
        const int c = (key % base) / 4, kind = key % 4;
        const auto& cell = band_.cells[c];
        Vec3 p = band_.domain.node(cell.i, 0, cell.k);
        const auto share = [](double a, double b) { return a / (a - b); };
        const int up = band_.neighbour[c][5];
        if (kind == 0) p.x += h_ * share(band_.phi[c], band_.phi[band_.neighbour[c][1]]);
        if (kind == 1) p.z += h_ * share(band_.phi[c], band_.phi[up]);
        if (kind == 2) p.x += side * 0.5 * h_ * share(band_.phi[c], side_value(c, side));
        if (kind == 3) {
            p.x = side < 0 ? band_.domain.x_min() : band_.domain.x_max();
            p.z += h_ * share(side_value(c, side), side_value(up, side));
        }
        return p;
    }

    ContourChain walk(int first, std::vector<char>& done) const {
        ContourChain chain;
        int period = 0;
        for (int key = first;;) {
            done[key] = 1;
            ContourPoint q;
            q.p = point(key);
            q.p.x += period * band_.domain.width_x();
            q.fixed = mirror_ && key % 4 == 3;
            chain.points.push_back(q);
            if (after_[key] < 0) break;
            period += step_[key];
            key = after_[key];
            if (key == first) {
                chain.closed = true;
                chain.shift = period * band_.domain.width_x();
                break;
            }
        }
        return chain;
    }

    std::vector<ContourChain> collect() const {
        std::vector<ContourChain> chains;
        std::vector<char> done(after_.size(), 0);
        for (int pass = 0; pass < 2; ++pass) // open chains first: they start at a side
            for (std::size_t key = 0; key < after_.size(); ++key)
                if (after_[key] >= 0 && !done[key] && (pass == 1 || !has_before_[key]))
                    chains.push_back(walk(static_cast<int>(key), done));
        return chains;
    }

    const Band& band_;
    double h_;
    bool mirror_;
    std::vector<int> after_;
    std::vector<signed char> step_;
    std::vector<char> has_before_;
};

} // namespace

std::vector<ContourChain> contour_chains(const Band& band) {
    return Marcher(band).run();
}

void merge_slivers(ContourChain& chain, double shortest) {
    auto& points = chain.points;
    const auto at = [&](int n) {
        const int size = static_cast<int>(points.size());
        if (n < 0) return points[n + size].p - Vec3(chain.shift, 0, 0);
        if (n >= size) return points[n - size].p + Vec3(chain.shift, 0, 0);
        return points[n].p;
    };
    const auto removable = [&](int n) {
        const int size = static_cast<int>(points.size());
        return !points[n % size].fixed && (chain.closed || (n > 0 && n < size - 1));
    };
    // How far the contour moves when point n goes.
    const auto cost = [&](int n) {
        const Vec3 a = at(n - 1), b = at(n + 1), along = b - a;
        return std::fabs(along.cross(at(n) - a).y) / std::max(along.length(), 1e-300);
    };
    const double same = 1e-6 * shortest; // decisions must not hang on the direction of the walk
    std::vector<double> lengths;
    const auto measure = [&] {
        lengths.clear();
        for (int n = 0; n < static_cast<int>(points.size()) - (chain.closed ? 0 : 1); ++n)
            lengths.push_back((at(n + 1) - at(n)).length());
    };
    measure();
    while (points.size() > 3) {
        const int segments = static_cast<int>(lengths.size());
        int least = -1;
        double length = shortest;
        for (int n = 0; n < segments; ++n) {
            const double l = lengths[n];
            if (l < length - (least < 0 ? 0 : same) && (removable(n) || removable(n + 1))) {
                least = n;
                length = l;
            }
        }
        if (least < 0) return;
        const int next = (least + 1) % static_cast<int>(points.size());
        const bool first = removable(least), second = removable(next);
        const double gain = first && second ? cost(next) - cost(least) : first ? 1 : -1;
        if (first && second && std::fabs(gain) < same) {
            points[least].p = 0.5 * (at(least) + at(least + 1));
            points.erase(points.begin() + next);
        } else {
            points.erase(points.begin() + (gain > 0 ? least : next));
        }
        measure();
    }
}

} // namespace rille::geometry
