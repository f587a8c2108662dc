// SPDX-License-Identifier: Apache-2.0
#include "geometry/dual_mesh.hpp"
#include "geometry/mirror_side.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

struct CellValues {
    std::array<double, 8> value{}; ///< on the side plane where the cell lies on one
    std::array<bool, 2> half{};    ///< half cell at a mirror side
    std::array<bool, 2> across{};  ///< cell that reaches over a periodic side
};

CellValues cell_values(const Band& band, const DualCell& cell) {
    CellValues out;
    const Domain& d = band.domain;
    const auto& c = band.cells[cell.node];
    const bool mirror = d.sides == Sides::mirror;
    const bool last[2] = {c.i == d.cells_x - 1, c.j == d.cells_y - 1};
    for (int axis = 0; axis < 2; ++axis) {
        out.half[axis] = mirror && (cell.low[axis] || last[axis]);
        out.across[axis] = !mirror && last[axis];
    }
    for (int m = 0; m < 8; ++m) {
        out.value[m] = band.phi[cell.corner[m]];
        for (int axis = 0; axis < 2; ++axis)
            if (out.half[axis])
                out.value[m] += change_to_side(band, cell.corner[m], axis, cell.low[axis]);
    }
    for (int axis = 0; axis < 2; ++axis)
        if (out.across[axis])
            for (int m = 0; m < 8; ++m)
                if (!(m >> axis & 1))
                    out.value[m] = out.value[m | 1 << axis] =
                        0.5 * (out.value[m] + out.value[m | 1 << axis]);
    return out;
}

/// Whether the averaged values of a cell that reaches over a periodic side cross there.
bool crosses_side(const CellValues& v) {
    const bool gas = v.value[0] >= 0;
    return std::any_of(v.value.begin(), v.value.end(), [&](double x) { return (x >= 0) != gas; });
}

/// `meet_side`: end on a periodic side where the cell reaches over it.
CrossedCell crossings(const Band& band, const DualMesh& mesh, int vertex, bool meet_side) {
    const DualCell& cell = mesh.cells[mesh.cell_of_vertex[vertex]];
    const int sheet = vertex - cell.first_vertex;
    const Domain& d = band.domain;
    const auto& c = band.cells[cell.node];
    CellValues v = cell_values(band, cell);
    const bool across = v.across[0] || v.across[1];
    const bool to_side = meet_side && across && cell.sheets == 1 && crosses_side(v);
    const double x_max = 0.5 * d.width_x(), y_max = 0.5 * d.width_y();
    const double side[2] = {cell.low[0] ? -x_max : x_max, cell.low[1] ? -y_max : y_max};

    CrossedCell out;
    out.low = d.node(c.i, c.j, c.k);
    out.high = out.low + Vec3(d.spacing);
    Vec3 box_low = out.low, box_high = out.high;
    for (int axis = 0; axis < 2; ++axis) {
        out.on_side[axis] = v.half[axis] || (v.across[axis] && to_side);
        if (out.on_side[axis]) box_low[axis] = box_high[axis] = side[axis];
        if (v.half[axis]) {
            (cell.low[axis] ? out.high : out.low)[axis] = out.low[axis];
            (cell.low[axis] ? out.low : out.high)[axis] = side[axis];
        }
    }
    for (int axis = 0; axis < 3; ++axis)
        for (int bits = 0; bits < 4; ++bits) {
            const int u = (axis + 1) % 3, w = (axis + 2) % 3;
            const int from = (bits & 1) << u | (bits >> 1) << w, to = from | 1 << axis;
            bool skip = axis < 2 && out.on_side[axis];
            for (int m = 0; m < 2; ++m)
                skip = skip || (out.on_side[m] && (from >> m & 1));
            if (skip) continue;
            const double real_from = band.phi[cell.corner[from]],
                         real_to = band.phi[cell.corner[to]];
            const double value_from = out.on_side[0] || out.on_side[1] ? v.value[from] : real_from;
            const double value_to = out.on_side[0] || out.on_side[1] ? v.value[to] : real_to;
            double t = 0;
            if (to_side) {
                if ((value_from >= 0) == (value_to >= 0)) continue;
                t = value_from / (value_from - value_to);
            } else {
                if (cell.loop[edge_number(axis, from)] != sheet) continue;
                const double real = real_from - real_to, moved = value_from - value_to;
                // A steep surface may leave the edge on its way to the side: follow it.
                t = moved * real > 0 && std::fabs(moved) > 0.2 * std::fabs(real)
                        ? std::clamp(value_from / moved, -1.5, 2.5)
                        : real_from / real;
            }
            CrossedEdge& e = out.edge[out.count++];
            for (int m = 0; m < 3; ++m) {
                e.a[m] = from >> m & 1 ? box_high[m] : box_low[m];
                e.b[m] = to >> m & 1 ? box_high[m] : box_low[m];
            }
            e.crossing = e.a + (e.b - e.a) * t;
        }
    return out;
}

} // namespace

CrossedCell crossed_cell(const Band& band, const DualMesh& mesh, int vertex) {
    const CrossedCell to_side = crossings(band, mesh, vertex, true);
    if (band.domain.sides == Sides::mirror || !(to_side.on_side[0] || to_side.on_side[1]))
        return to_side;
    // A wall along a periodic side may be far from where it meets the side: leave it where it is.
    const CrossedCell free = crossings(band, mesh, vertex, false);
    const double moved = (to_side.mean() - free.mean()).length();
    return moved < 0.6 * band.domain.spacing ? to_side : free;
}

namespace {

double minmod(double a, double b) {
    if (a * b <= 0) return 0;
    return std::fabs(a) < std::fabs(b) ? a : b;
}

/// Part of the grid edge from the node to its upper neighbour along `axis` that lies before the
/// contour: phi linear, bent by what the second differences at both ends agree on.
double crossing_share(const Band& band, int node, int axis) {
    const int to = band.neighbour[node][2 * axis + 1];
    const int before = band.neighbour[node][2 * axis], after = band.neighbour[to][2 * axis + 1];
    const double a = band.phi[node], b = band.phi[to];
    double t = a / (a - b);
    if (before < 0 || after < 0) return t;
    double bend = minmod(band.phi[before] - 2 * a + b, a - 2 * b + band.phi[after]);
    if (bend == 0) return t;
    bend = std::clamp(bend, -std::fabs(b - a), std::fabs(b - a));
    // a + (b - a) t - bend t (1 - t) / 2 = 0: exactly one root lies between nodes of unlike sign.
    const double half = 0.5 * (b - a - 0.5 * bend);
    const double root = std::sqrt(std::max(0.0, half * half - 0.5 * bend * a));
    t = -a / (half + std::copysign(root, b - a));
    return std::clamp(t, 0.0, 1.0);
}

void find_crossings(const Band& band, DualMesh& mesh) {
    mesh.crossing.resize(mesh.quads.size());
    over_ranges(mesh.quads.size(), 4096, [&](std::size_t first, std::size_t last) {
        for (std::size_t n = first; n < last; ++n) {
            const DualQuad& q = mesh.quads[n];
            const auto& c = band.cells[q.node];
            Vec3 p = band.domain.node(c.i, c.j, c.k);
            p[q.axis] += band.domain.spacing * crossing_share(band, q.node, q.axis);
            mesh.crossing[n] = p;
        }
    });
}

void link(DualMesh& mesh) {
    const std::size_t vertices = mesh.cell_of_vertex.size();
    mesh.first.assign(vertices + 1, 0);
    for (const DualQuad& q : mesh.quads)
        for (int v : q.vertex)
            ++mesh.first[v + 1];
    for (std::size_t v = 1; v < mesh.first.size(); ++v)
        mesh.first[v] += mesh.first[v - 1];
    mesh.round.resize(mesh.first.back());
    std::vector<int> fill(mesh.first.begin(), mesh.first.end() - 1);
    for (std::size_t n = 0; n < mesh.quads.size(); ++n)
        for (int v : mesh.quads[n].vertex)
            mesh.round[fill[v]++] = static_cast<int>(n);
}

/// Whether the cell ends on a side of the period or reaches over it.
bool at_side(const Band& band, const DualCell& cell) {
    const auto& c = band.cells[cell.node];
    return cell.low[0] || cell.low[1] || c.i == band.domain.cells_x - 1 ||
           c.j == band.domain.cells_y - 1;
}

void measure_normals(const Band& band, DualMesh& mesh) {
    mesh.normal.resize(mesh.quads.size());
    const double least = 1e-12 * band.domain.spacing * band.domain.spacing;
    over_ranges(mesh.quads.size(), 4096, [&](std::size_t first, std::size_t last) {
        for (std::size_t n = first; n < last; ++n) {
            const Vec3 cross = across(band.domain, mesh, mesh.quads[n]);
            const double length = cross.length();
            mesh.normal[n] = length > least ? cross / length : Vec3(0, 0, 0);
        }
    });
}

/// How far the mean of crossings lies below a curved surface through them [nm, along the mean
/// normal]: half the mean distance of the mean from their tangent planes.
Vec3 lift(const Band& band, const DualMesh& mesh, int v) {
    constexpr double most = 0.15; // [cells]
    Vec3 mean(0, 0, 0);
    double height = 0;
    int count = 0;
    for (int a = mesh.first[v]; a < mesh.first[v + 1]; ++a) {
        const Vec3& n = mesh.normal[mesh.round[a]];
        height += n.dot(between(band.domain, mesh.position[v], mesh.crossing[mesh.round[a]]));
        mean += n;
        ++count;
    }
    const double length = mean.length();
    if (length < 0.5 * count) return Vec3(0, 0, 0);
    const double limit = most * band.domain.spacing;
    return mean * (std::clamp(0.5 * height / count, -limit, limit) / length);
}

} // namespace

Vec3 across(const Domain& domain, const DualMesh& mesh, const DualQuad& q) {
    Vec3 p[4];
    for (int m = 0; m < 4; ++m) {
        p[m] = mesh.position[q.vertex[m]];
        if (q.image[m] & 1) p[m].x -= domain.width_x();
        if (q.image[m] & 2) p[m].y -= domain.width_y();
    }
    return (p[2] - p[0]).cross(p[3] - p[1]);
}

void place_vertices(const Band& band, DualMesh& mesh) {
    find_crossings(band, mesh);
    link(mesh);
    const std::size_t size = mesh.cell_of_vertex.size();
    mesh.position.resize(size);
    std::vector<char> side(size);
    over_ranges(size, 4096, [&](std::size_t first, std::size_t last) {
        for (std::size_t v = first; v < last; ++v) {
            const DualCell& cell = mesh.cells[mesh.cell_of_vertex[v]];
            side[v] = at_side(band, cell);
            if (side[v]) {
                mesh.position[v] = crossed_cell(band, mesh, static_cast<int>(v)).mean();
                continue;
            }
            Vec3 sum(0, 0, 0);
            for (int a = mesh.first[v]; a < mesh.first[v + 1]; ++a)
                sum += mesh.crossing[mesh.round[a]];
            mesh.position[v] = sum / (mesh.first[v + 1] - mesh.first[v]);
        }
    });
    measure_normals(band, mesh);
    std::vector<Vec3> lifted(size);
    over_ranges(size, 4096, [&](std::size_t first, std::size_t last) {
        for (std::size_t v = first; v < last; ++v)
            lifted[v] = side[v] ? mesh.position[v] : mesh.position[v] + lift(band, mesh, v);
    });
    mesh.position = std::move(lifted);
}

} // namespace rille::geometry
