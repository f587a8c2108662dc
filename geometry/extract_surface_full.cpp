// SPDX-License-Identifier: Apache-2.0
#include "geometry/dual_mesh.hpp"
#include "geometry/extract_surface.hpp"
#include "geometry/facets.hpp"
#include "geometry/period_clip.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <numeric>

namespace rille::geometry {

namespace {

constexpr std::size_t grain = 8192;

/// Connected part of each vertex, numbered in the order of first appearance.
std::vector<int> parts_of_vertices(const DualMesh& mesh) {
    std::vector<int> parent(mesh.position.size());
    std::iota(parent.begin(), parent.end(), 0);
    const auto root = [&](int v) {
        while (parent[v] != v)
            v = parent[v] = parent[parent[v]];
        return v;
    };
    for (const DualQuad& q : mesh.quads)
        for (int m = 1; m < 4; ++m) {
            const int a = root(q.vertex[0]), b = root(q.vertex[m]);
            parent[std::max(a, b)] = std::min(a, b);
        }
    std::vector<int> number(parent.size(), -1);
    int count = 0;
    for (int v = 0; v < static_cast<int>(parent.size()); ++v) {
        const int r = root(v);
        if (number[r] < 0) number[r] = count++;
        number[v] = number[r];
    }
    return number;
}

/// Copies vertices, once for each image of the period in which a quad uses them.
void add_vertices(const Band& band, const DualMesh& mesh, Surface& s) {
    std::vector<std::uint8_t> used(mesh.position.size(), 0);
    for (const DualQuad& q : mesh.quads)
        for (int m = 0; m < 4; ++m)
            used[q.vertex[m]] |= 1 << q.image[m];
    std::vector<int> start(mesh.position.size());
    const double x_min = band.domain.x_min(), y_min = band.domain.y_min();
    const double x_max = -x_min, y_max = -y_min;
    for (std::size_t v = 0; v < used.size(); ++v) {
        start[v] = static_cast<int>(s.vertices.size());
        for (int image = 0; image < 4; ++image) {
            if (!(used[v] >> image & 1)) continue;
            Vec3 p = mesh.position[v];
            if (image & 1) p.x = p.x == x_max ? x_min : p.x - band.domain.width_x();
            if (image & 2) p.y = p.y == y_max ? y_min : p.y - band.domain.width_y();
            s.vertices.push_back(p);
        }
    }
    s.corners.resize(mesh.quads.size());
    over_ranges(mesh.quads.size(), grain, [&](std::size_t first, std::size_t last) {
        for (std::size_t n = first; n < last; ++n)
            for (int m = 0; m < 4; ++m) {
                const DualQuad& q = mesh.quads[n];
                const int below = used[q.vertex[m]] & ((1 << q.image[m]) - 1);
                s.corners[n][m] = start[q.vertex[m]] + (below == 0 ? 0 : __builtin_popcount(below));
            }
    });
}

void measure(const DualMesh& mesh, const std::vector<int>& origin, double h, Surface& s) {
    const std::size_t size = s.corners.size();
    s.centre.resize(size);
    s.normal.resize(size);
    s.area.resize(size);
    over_ranges(size, grain, [&](std::size_t first, std::size_t last) {
        for (std::size_t n = first; n < last; ++n) {
            const auto& v = s.corners[n];
            const Vec3 a = s.vertices[v[0]], b = s.vertices[v[1]], c = s.vertices[v[2]],
                       d = s.vertices[v[3]];
            const Vec3 across = (c - a).cross(d - b) * 0.5;
            s.centre[n] = v[2] == v[3] ? (a + b + c) / 3.0 : (a + b + c + d) * 0.25;
            s.area[n] = across.length();
            if (s.area[n] > 1e-12 * h * h) {
                s.normal[n] = across / s.area[n];
            } else { // collapsed: the direction of its grid edge
                s.normal[n] = Vec3(0, 0, 0);
                const DualQuad& quad = mesh.quads[origin[n]];
                s.normal[n][quad.axis] = quad.up ? 1 : -1;
            }
        }
    });
}

/// Where the mesh is squeezed, next to a sharpened edge, a quad may be folded. Turns its corners so
/// that both facets look out of the solid, if either diagonal does that.
void settle_facets(Surface& s) {
    const auto worst = [&](const std::array<int, 4>& quad) {
        const Vec3 a = facet(s.vertices, quad, 0).cross(), b = facet(s.vertices, quad, 1).cross();
        const double length = (a + b).length();
        return length > 0 ? std::min(a.dot(a + b), b.dot(a + b)) / length : 0.0;
    };
    over_ranges(s.corners.size(), grain, [&](std::size_t first, std::size_t last) {
        for (std::size_t n = first; n < last; ++n) {
            std::array<int, 4>& quad = s.corners[n];
            if (quad[2] == quad[3] || worst(quad) > 0) continue;
            const std::array<int, 4> turned{quad[1], quad[2], quad[3], quad[0]};
            if (worst(turned) > worst(quad)) quad = turned;
        }
    });
}

/// Numbers the parts; 0 is the uppermost that covers the period with the gas above.
void number_chains(const DualMesh& mesh, const std::vector<int>& origin, const Domain& domain,
                   Surface& s) {
    const std::vector<int> part = parts_of_vertices(mesh);
    const int parts = part.empty() ? 0 : *std::max_element(part.begin(), part.end()) + 1;
    std::vector<double> cover(parts, 0), top(parts, -1e300);
    s.chain.resize(s.size());
    for (std::size_t n = 0; n < s.size(); ++n) {
        const int p = s.chain[n] = part[mesh.quads[origin[n]].vertex[0]];
        cover[p] += s.area[n] * s.normal[n].z;
        top[p] = std::max(top[p], s.centre[n].z);
    }
    int open = -1;
    for (int p = 0; p < parts; ++p)
        if (cover[p] > 0.5 * domain.width_x() * domain.width_y() &&
            (open < 0 || top[p] > top[open]))
            open = p;
    for (int& c : s.chain)
        c = c == open ? 0 : open < 0 || c < open ? c + 1 : c;
}

} // namespace

Surface extract_full(const Band& band) {
    DualMesh mesh = dual_topology(band);
    place_vertices(band, mesh);
    sharpen(band, mesh);
    Surface s;
    add_vertices(band, mesh, s);
    std::vector<int> origin(mesh.quads.size());
    if (band.domain.sides == Sides::periodic)
        origin = clip_to_period(band.domain, s);
    else
        std::iota(origin.begin(), origin.end(), 0);
    settle_facets(s);
    measure(mesh, origin, band.domain.spacing, s);
    number_chains(mesh, origin, band.domain, s);
    return s;
}

} // namespace rille::geometry
