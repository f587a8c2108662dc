// SPDX-License-Identifier: Apache-2.0
#include "geometry/check.hpp"
#include "geometry/dual_mesh.hpp"
#include "geometry/ranges.hpp"

#include <numeric>

namespace rille::geometry {

namespace {

constexpr std::size_t grain = 16384;

/// Set bits of a mask of four.
int bits_in(int mask) {
    static constexpr std::int8_t count[16] = {0, 1, 1, 2, 1, 2, 2, 3, 1, 2, 2, 3, 2, 3, 3, 4};
    return count[mask & 15];
}

/// Variants of the dual cell above a node: bit 0 the half cell below it in x, bit 1 in y.
class Topology {
public:
    explicit Topology(const Band& band)
        : band_(band), mirror_(band.domain.sides == Sides::mirror), cell_mask_(band.size(), 0),
          edge_mask_(band.size(), 0), cell_start_(band.size() + 1, 0) {}

    DualMesh run() {
        mark();
        list_cells();
        over_ranges(mesh_.cells.size(), grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n)
                find_sheets(mesh_.cells[n]);
        });
        number_vertices();
        over_ranges(mesh_.quads.size(), grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n)
                join(mesh_.quads[n]);
        });
        return std::move(mesh_);
    }

private:
    bool gas(int node) const { return gas_[node]; }

    /// Whether grid edges along `axis` leave this node (not across a mirror side).
    bool has_edge(int node, int axis) const {
        const auto& c = band_.cells[node];
        if (band_.neighbour[node][2 * axis + 1] < 0) return false;
        if (axis == 0) return !mirror_ || c.i + 1 < band_.domain.cells_x;
        if (axis == 1) return !mirror_ || c.j + 1 < band_.domain.cells_y;
        return true;
    }

    /// Corners of a variant; the corner's number, or -1 where the band ends.
    std::array<int, 8> corners(int node, int variant) const {
        std::array<int, 8> out{};
        for (int bits = 0; bits < 8; ++bits) {
            int n = node;
            for (int axis = 0; axis < 3 && n >= 0; ++axis)
                if ((bits >> axis & 1) && !(axis < 2 && (variant >> axis & 1)))
                    n = band_.neighbour[n][2 * axis + 1];
            out[bits] = n;
        }
        return out;
    }

    void mark() {
        // Of the cube above a node: all gas, all solid, crossed or not all in the band; built up
        // axis by axis, so that each node asks three others only.
        constexpr std::uint8_t crossed = 2, missing = 3; // 0, 1: all solid, all gas
        const auto join = [](std::uint8_t a, std::uint8_t b) -> std::uint8_t {
            return a == missing || b == missing ? missing : a == b ? a : crossed;
        };
        const std::size_t size = band_.size();
        std::vector<std::uint8_t> state(size), next(size);
        gas_.resize(size);
        over_ranges(size, grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n)
                state[n] = gas_[n] = band_.phi[n] >= 0;
        });
        for (int axis = 0; axis < 3; ++axis) {
            over_ranges(size, grain, [&](std::size_t first, std::size_t last) {
                for (std::size_t n = first; n < last; ++n) {
                    const int up = band_.neighbour[n][2 * axis + 1];
                    next[n] = up < 0 ? missing : join(state[n], state[up]);
                    if (up < 0 || gas_[n] == gas_[up]) continue;
                    if (has_edge(static_cast<int>(n), axis)) edge_mask_[n] |= 1 << axis;
                }
            });
            state.swap(next);
        }
        over_ranges(size, grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n) {
                cell_mask_[n] = state[n] == crossed;
                const auto& c = band_.cells[n];
                if (mirror_ && (c.i == 0 || c.j == 0)) mark_half_cells(static_cast<int>(n));
            }
        });
    }

    /// Cells between a lower mirror side and its nodes.
    void mark_half_cells(int node) {
        const auto& c = band_.cells[node];
        for (int variant = 1; variant < 4; ++variant) {
            if ((variant & 1) && c.i != 0) continue;
            if ((variant & 2) && c.j != 0) continue;
            const auto corner = corners(node, variant);
            bool full = true, crossed = false;
            for (int m : corner) {
                if (m < 0)
                    full = false;
                else
                    crossed = crossed || gas(m) != gas(node);
            }
            if (full && crossed) cell_mask_[node] |= 1 << variant;
        }
    }

    void list_cells() {
        std::size_t cells = 0, quads = 0;
        for (std::size_t n = 0; n < band_.size(); ++n) {
            cell_start_[n] = static_cast<int>(cells);
            cells += bits_in(cell_mask_[n]);
            quads += bits_in(edge_mask_[n]);
        }
        mesh_.cells.reserve(cells);
        mesh_.quads.reserve(quads);
        for (int n = 0; n < static_cast<int>(band_.size()); ++n) {
            for (int variant = 0; variant < 4; ++variant)
                if (cell_mask_[n] >> variant & 1) {
                    DualCell cell;
                    cell.node = n;
                    cell.low = {(variant & 1) != 0, (variant & 2) != 0};
                    cell.corner = corners(n, variant);
                    mesh_.cells.push_back(cell);
                }
            for (int axis = 0; axis < 3; ++axis)
                if (edge_mask_[n] >> axis & 1) {
                    DualQuad quad;
                    quad.node = n;
                    quad.axis = static_cast<std::uint8_t>(axis);
                    quad.up = !gas(n);
                    mesh_.quads.push_back(quad);
                }
        }
    }

    /// Joins crossed edges through the cube's faces into sheets. On a face with four crossings the
    /// mean of its corners decides; both cells that share the face decide alike.
    void find_sheets(DualCell& cell) const {
        std::array<int, 12> parent;
        std::iota(parent.begin(), parent.end(), 0);
        std::array<bool, 12> crossed{};
        const auto root = [&](int e) {
            while (parent[e] != e)
                e = parent[e];
            return e;
        };
        const auto unite = [&](int a, int b) {
            a = root(a);
            b = root(b);
            parent[std::max(a, b)] = std::min(a, b);
        };
        for (int axis = 0; axis < 3; ++axis)
            for (int upper = 0; upper < 2; ++upper) {
                const int u = (axis + 1) % 3, v = (axis + 2) % 3, base = upper << axis;
                const int ring[4] = {base, base | 1 << u, base | 1 << u | 1 << v, base | 1 << v};
                const int edge[4] = {edge_number(u, ring[0]), edge_number(v, ring[1]),
                                     edge_number(u, ring[3]), edge_number(v, ring[0])};
                int hit[4], hits = 0;
                for (int m = 0; m < 4; ++m)
                    if (gas(cell.corner[ring[m]]) != gas(cell.corner[ring[(m + 1) % 4]]))
                        hit[hits++] = m;
                for (int m = 0; m < hits; ++m)
                    crossed[edge[hit[m]]] = true;
                if (hits == 2) unite(edge[hit[0]], edge[hit[1]]);
                if (hits < 4) continue;
                double sum = 0;
                for (int m : ring)
                    sum += band_.phi[cell.corner[m]];
                // Edges m and m + 1 meet at ring corner m + 1: joined round it if it is cut off.
                const bool cut_odd = gas(cell.corner[ring[1]]) != (sum >= 0);
                unite(edge[cut_odd ? 0 : 1], edge[cut_odd ? 1 : 2]);
                unite(edge[cut_odd ? 2 : 3], edge[cut_odd ? 3 : 0]);
            }
        std::array<int, 12> number;
        number.fill(-1);
        cell.sheets = 0;
        for (int e = 0; e < 12; ++e) {
            cell.loop[e] = -1;
            if (!crossed[e]) continue;
            int& sheet = number[root(e)];
            if (sheet < 0) sheet = cell.sheets++;
            cell.loop[e] = static_cast<std::int8_t>(sheet);
        }
    }

    void number_vertices() {
        int count = 0;
        for (DualCell& cell : mesh_.cells) {
            cell.first_vertex = count;
            count += cell.sheets;
        }
        mesh_.cell_of_vertex.reserve(count);
        for (std::size_t n = 0; n < mesh_.cells.size(); ++n)
            for (int m = 0; m < mesh_.cells[n].sheets; ++m)
                mesh_.cell_of_vertex.push_back(static_cast<int>(n));
    }

    /// The cell that has the quad's edge at its upper side in the axes of `back`.
    void join(DualQuad& quad) const {
        const int u = (quad.axis + 1) % 3, v = (quad.axis + 2) % 3;
        const int back[4] = {1 << u | 1 << v, 1 << v, 0, 1 << u};
        for (int m = 0; m < 4; ++m) {
            int node = quad.node, variant = 0;
            std::uint8_t image = 0;
            for (int axis = 0; axis < 3; ++axis) {
                if (!(back[m] >> axis & 1)) continue;
                const int at = axis == 0   ? band_.cells[quad.node].i
                               : axis == 1 ? band_.cells[quad.node].j
                                           : 1;
                if (at == 0 && mirror_)
                    variant |= 1 << axis;
                else
                    node = band_.neighbour[node][2 * axis];
                if (at == 0 && !mirror_) image |= 1 << axis;
                RILLE_CHECK(node >= 0, "the band is too narrow at the front");
            }
            RILLE_CHECK(cell_mask_[node] >> variant & 1, "the band is too narrow at the front");
            const int number = cell_start_[node] + bits_in(cell_mask_[node] & ((1 << variant) - 1));
            const DualCell& cell = mesh_.cells[number];
            const int slot = quad.up ? m : 3 - m;
            quad.vertex[slot] = cell.first_vertex + cell.loop[edge_number(quad.axis, back[m])];
            quad.image[slot] = image;
        }
    }

    const Band& band_;
    bool mirror_;
    std::vector<std::uint8_t> gas_, cell_mask_, edge_mask_;
    std::vector<int> cell_start_;
    DualMesh mesh_;
};

} // namespace

DualMesh dual_topology(const Band& band) {
    return Topology(band).run();
}

} // namespace rille::geometry
