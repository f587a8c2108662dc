// SPDX-License-Identifier: Apache-2.0
#include "geometry/fold.hpp"

#include "geometry/band.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <tuple>
#include <utility>

namespace rille::geometry {
namespace {

constexpr double same_place = 1e-9; // of the period, or of a cell

/// Whether every opening has its mirror image about the plane x = 0 (axis 0) or y = 0 (axis 1).
bool mirrored_openings(const Domain& domain, const std::vector<Opening>& openings, int axis) {
    const double near = same_place * (axis == 0 ? domain.width_x() : domain.width_y());
    const auto is_image = [&](const Opening& a, const Opening& b) {
        const bool trench = a.shape == Opening::Shape::trench;
        const double x = axis == 0 ? -a.centre_x : a.centre_x;
        const double y = axis == 1 ? -a.centre_y : a.centre_y;
        return a.shape == b.shape && std::fabs(a.width_x - b.width_x) <= near &&
               std::fabs(x - b.centre_x) <= near &&
               (trench ||
                (std::fabs(a.width_y - b.width_y) <= near && std::fabs(y - b.centre_y) <= near));
    };
    return std::all_of(openings.begin(), openings.end(), [&](const Opening& a) {
        return std::any_of(openings.begin(), openings.end(),
                           [&](const Opening& b) { return is_image(a, b); });
    });
}

/// Which elements of the part and of its image follow one another in the whole, and by what number
/// their chains go there.
struct Row {
    int element;
    bool image;
    int chain;
};

/// Whether an element of a contour starts or ends on the plane where it is mirrored.
struct Ends {
    bool starts, ends;
};

/// Both copies of a contour's elements in walking order, chain by chain: the image of a chain is
/// walked from its end to its start.
std::vector<Row> contour_rows(const Surface& s, const std::vector<char>& on_plane) {
    std::vector<Row> rows;
    const int n = static_cast<int>(s.size());
    int chains = 0;
    for (int first = 0; first < n;) {
        int last = first;
        while (last + 1 < n && s.chain[last + 1] == s.chain[first])
            ++last;
        const Ends meets{s.previous[first] < 0 && on_plane[s.corners[first][0]],
                         s.next[last] < 0 && on_plane[s.corners[last][1]]};
        const bool joined = meets.starts || meets.ends;
        const auto add = [&](bool image, int chain) {
            for (int k = 0; k <= last - first; ++k)
                rows.push_back({image ? last - k : first + k, image, chain});
        };
        if (joined && !meets.ends) {
            add(true, chains);
            add(false, chains++);
        } else {
            add(false, chains++);
            add(true, joined ? chains - 1 : chains++);
        }
        first = last + 1;
    }
    return rows;
}

/// Both copies of a mesh: the part, then its image. A piece that reaches the plane is one with its
/// image.
std::vector<Row> mesh_rows(const Surface& s, const std::vector<char>& on_plane) {
    const int n = static_cast<int>(s.size());
    int chains = 1;
    for (const int chain : s.chain)
        chains = std::max(chains, chain + 1);
    std::vector<char> reaches(chains, 0);
    reaches[0] = 1;
    for (int e = 0; e < n; ++e)
        for (const int v : s.corners[e])
            if (on_plane[v]) reaches[s.chain[e]] = 1;
    std::vector<int> of_image(chains);
    int next = chains;
    for (int c = 0; c < chains; ++c)
        of_image[c] = reaches[c] ? c : next++;
    std::vector<Row> rows;
    for (int e = 0; e < n; ++e)
        rows.push_back({e, false, s.chain[e]});
    for (int e = 0; e < n; ++e)
        rows.push_back({e, true, of_image[s.chain[e]]});
    return rows;
}

/// Corners of the image of an element, anticlockwise again, a quad cut along the same diagonal.
std::array<int, 4> turned(const std::array<int, 4>& q, const std::vector<int>& image) {
    const auto at = [&](int k) { return image[q[k]]; };
    if (q[2] < 0) return {at(1), at(0), -1, -1};
    if (q[3] == q[2]) return {at(1), at(0), at(2), at(2)};
    return {at(0), at(3), at(2), at(1)};
}

void link(Surface& s, const std::vector<Row>& rows, const Surface& part) {
    const int n = static_cast<int>(rows.size());
    s.next.assign(n, -1);
    s.previous.assign(n, -1);
    std::vector<int> place[2] = {std::vector<int>(part.size()), std::vector<int>(part.size())};
    for (int e = 0; e < n; ++e)
        place[rows[e].image][rows[e].element] = e;
    const auto join = [&](int from, int to) {
        s.next[from] = to;
        s.previous[to] = from;
    };
    for (int e = 0; e < static_cast<int>(part.size()); ++e)
        if (part.next[e] >= 0) {
            join(place[0][e], place[0][part.next[e]]);
            join(place[1][part.next[e]], place[1][e]);
        }
    // What ends on the plane goes on as its image, and the image there as itself.
    for (int e = 0; e < static_cast<int>(part.size()); ++e) {
        const int here = place[0][e], there = place[1][e];
        if (part.next[e] < 0 && s.corners[here][1] == s.corners[there][0]) join(here, there);
        if (part.previous[e] < 0 && s.corners[here][0] == s.corners[there][1]) join(there, here);
    }
}

/// `from` moved so that the plane of one axis lies at 0, with its image about that plane.
Unfolded unfold_axis(const Domain& domain, const Surface& from, int axis) {
    const double edge = 0.5 * (axis == 0 ? domain.width_x() : domain.width_y());
    const auto moved = [&](Vec3 p) {
        p[axis] -= edge;
        if (std::fabs(p[axis]) <= same_place * domain.spacing) p[axis] = 0;
        return p;
    };
    const auto mirrored = [&](Vec3 p) {
        p[axis] = -p[axis];
        return p;
    };
    Unfolded whole;
    Surface& s = whole.surface;
    const std::size_t points = from.vertices.size();
    std::vector<char> on_plane(points);
    std::vector<int> itself(points), image(points);
    for (std::size_t v = 0; v < points; ++v) {
        itself[v] = static_cast<int>(v);
        s.vertices.push_back(moved(from.vertices[v]));
        on_plane[v] = s.vertices[v][axis] == 0;
    }
    for (std::size_t v = 0; v < points; ++v) {
        image[v] = on_plane[v] ? itself[v] : static_cast<int>(s.vertices.size());
        if (!on_plane[v]) s.vertices.push_back(mirrored(s.vertices[v]));
    }
    const bool contour = domain.planar_contour();
    const std::vector<Row> rows =
        contour ? contour_rows(from, on_plane) : mesh_rows(from, on_plane);
    for (const Row& row : rows) {
        const int e = row.element;
        const Vec3 centre = moved(from.centre[e]);
        whole.source.push_back(e);
        s.corners.push_back(row.image ? turned(from.corners[e], image) : from.corners[e]);
        s.centre.push_back(row.image ? mirrored(centre) : centre);
        s.normal.push_back(row.image ? mirrored(from.normal[e]) : from.normal[e]);
        s.area.push_back(from.area[e]);
        s.chain.push_back(row.chain);
    }
    if (contour) link(s, rows, from);
    return whole;
}

} // namespace

Domain Fold::part(const Domain& whole) const {
    RILLE_CHECK(!any() || whole.sides == Sides::mirror, "only mirror sides can be folded");
    RILLE_CHECK(!x || whole.cells_x % 2 == 0, "the cells along x do not come in pairs");
    RILLE_CHECK(!y || (whole.symmetry == Symmetry::full && whole.cells_y % 2 == 0),
                "the cells along y do not come in pairs");
    Domain part = whole;
    if (x) part.cells_x /= 2;
    if (y) part.cells_y /= 2;
    return part;
}

Domain Fold::whole(const Domain& part) const {
    Domain whole = part;
    if (x) whole.cells_x *= 2;
    if (y) whole.cells_y *= 2;
    return whole;
}

Vec3 Fold::origin(const Domain& part) const {
    return {x ? -0.5 * part.width_x() : 0.0, y ? -0.5 * part.width_y() : 0.0, 0.0};
}

Vec3 Fold::image(int copy, Vec3 v) const {
    const bool over_x = x && copy % 2 == 1, over_y = y && copy / (x ? 2 : 1) == 1;
    return {over_x ? -v.x : v.x, over_y ? -v.y : v.y, v.z};
}

Fold symmetry_planes(const Domain& domain, const MaskShape& mask) {
    if (domain.revolved() || domain.sides != Sides::mirror) return {};
    const bool full = domain.symmetry == Symmetry::full;
    return {domain.cells_x % 2 == 0 && mirrored_openings(domain, mask.openings, 0),
            full && domain.cells_y % 2 == 0 && mirrored_openings(domain, mask.openings, 1)};
}

Unfolded unfold(const Fold& fold, const Domain& part, const Surface& surface) {
    Unfolded whole{surface, std::vector<int>(surface.size())};
    for (std::size_t e = 0; e < surface.size(); ++e)
        whole.source[e] = static_cast<int>(e);
    for (const int axis : {0, 1}) {
        if (!(axis == 0 ? fold.x : fold.y)) continue;
        Unfolded next = unfold_axis(part, whole.surface, axis);
        for (int& e : next.source)
            e = whole.source[e];
        whole = std::move(next);
    }
    return whole;
}

Front unfold(const Fold& fold, const Front& part) {
    const Band& from = part.band();
    Band whole;
    whole.domain = fold.whole(from.domain);
    struct Node {
        Band::Cell cell;
        double phi;
    };
    std::vector<Node> nodes;
    for (int copy = 0; copy < fold.copies(); ++copy) {
        const Vec3 sign = fold.image(copy, {1, 1, 1});
        for (std::size_t c = 0; c < from.size(); ++c) {
            Band::Cell cell = from.cells[c];
            if (sign.x < 0) cell.i = whole.domain.cells_x - 1 - cell.i;
            if (sign.y < 0) cell.j = whole.domain.cells_y - 1 - cell.j;
            nodes.push_back({cell, from.phi[c]});
        }
    }
    std::sort(nodes.begin(), nodes.end(), [](const Node& a, const Node& b) {
        return std::tie(a.cell.k, a.cell.j, a.cell.i) < std::tie(b.cell.k, b.cell.j, b.cell.i);
    });
    for (const Node& node : nodes) {
        whole.cells.push_back(node.cell);
        whole.phi.push_back(node.phi);
    }
    return Front(std::move(whole));
}

} // namespace rille::geometry
