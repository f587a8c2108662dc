// SPDX-License-Identifier: Apache-2.0
#include "geometry/metrology.hpp"
#include "geometry/section.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <unordered_map>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;

/// A piece of the level cut, gas on the left.
struct Piece {
    std::array<double, 2> from, to;
    double level_normal; ///< length of the element's unit normal in the plane of the cut
    int element;
};

/// Cuts both halves of every quad (0 1 3 and 2 3 1) at height z.
std::vector<Piece> level_cut(const Surface& s, double z, double shortest) {
    std::vector<Piece> out;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const auto& q = s.corners[e];
        for (const auto& half : {std::array<int, 3>{q[0], q[1], q[3]}, {q[2], q[3], q[1]}}) {
            std::array<Vec3, 2> ends;
            int found = 0;
            for (int k = 0; k < 3 && found < 2; ++k) {
                int v = half[k], w = half[(k + 1) % 3];
                if ((s.vertices[v].z > z) == (s.vertices[w].z > z)) continue;
                if (v > w) std::swap(v, w); // the same bits from either face of the edge
                const Vec3 &a = s.vertices[v], &b = s.vertices[w];
                ends[found++] = a + (z - a.z) / (b.z - a.z) * (b - a);
            }
            const Vec3 face = (s.vertices[half[1]] - s.vertices[half[0]])
                                  .cross(s.vertices[half[2]] - s.vertices[half[0]]);
            if (found < 2 || face.length() == 0) continue;
            const Vec3 n = face.normalized();
            const Vec3 along = ends[1] - ends[0];
            if (-along.y * n.x + along.x * n.y < 0) std::swap(ends[0], ends[1]);
            if (along.length() < shortest) continue; // a corner that lies in the plane
            out.push_back({{ends[0].x, ends[0].y},
                           {ends[1].x, ends[1].y},
                           std::hypot(n.x, n.y),
                           static_cast<int>(e)});
        }
    }
    return out;
}

/// Images of the cut within one period of the axis, so that a loop across a side is whole.
std::vector<Piece> with_images(const Domain& domain, const std::vector<Piece>& cut,
                               const FeatureSite& site) {
    const double width[2] = {domain.width_x(), domain.width_y()};
    const double centre[2] = {site.centre_x, site.centre_y};
    int middle[2];
    for (int a = 0; a < 2; ++a)
        middle[a] = static_cast<int>(std::floor(centre[a] / width[a] + 0.5));
    std::vector<Piece> out;
    for (int shift = 0; shift < 9; ++shift) {
        const int image[2] = {middle[0] + shift % 3 - 1, middle[1] + shift / 3 - 1};
        bool turned = false;
        std::array<double, 2> sign{1, 1};
        for (int a = 0; a < 2; ++a)
            if (domain.sides == Sides::mirror && image[a] % 2 != 0) {
                sign[a] = -1;
                turned = !turned;
            }
        for (Piece p : cut) {
            for (int a = 0; a < 2; ++a)
                for (auto* end : {&p.from, &p.to})
                    (*end)[a] = sign[a] * (*end)[a] + image[a] * width[a];
            if (turned) std::swap(p.from, p.to);
            out.push_back(p);
        }
    }
    return out;
}

/// Pieces by their starting point, found within a tolerance.
class Starts {
public:
    Starts(const std::vector<Piece>& pieces, double tolerance)
        : pieces_(pieces), per_cell_(0.25 / tolerance), tolerance_(tolerance) {
        for (std::size_t i = 0; i < pieces.size(); ++i)
            cells_[key(pieces[i].from[0], pieces[i].from[1], 0, 0)].push_back(static_cast<int>(i));
    }
    int find(const std::array<double, 2>& at) const {
        for (int c = 0; c < 9; ++c) {
            const auto cell = cells_.find(key(at[0], at[1], c % 3 - 1, c / 3 - 1));
            if (cell == cells_.end()) continue;
            for (const int i : cell->second)
                if (std::hypot(pieces_[i].from[0] - at[0], pieces_[i].from[1] - at[1]) < tolerance_)
                    return i;
        }
        return -1;
    }

private:
    /// Cells that share a key cost a comparison, no more.
    std::uint64_t key(double x, double y, int dx, int dy) const {
        const auto i = static_cast<std::uint64_t>(std::llround(x * per_cell_) + dx);
        const auto j = static_cast<std::uint64_t>(std::llround(y * per_cell_) + dy);
        return i * 0x9e3779b97f4a7c15ull + j;
    }
    const std::vector<Piece>& pieces_;
    double per_cell_, tolerance_;
    std::unordered_map<std::uint64_t, std::vector<int>> cells_;
};

/// Closed loop of pieces with its area, positive round gas.
struct Loop {
    std::vector<int> pieces;
    double area = 0;
};

std::vector<Loop> closed_loops(const std::vector<Piece>& pieces, double tolerance) {
    const Starts starts(pieces, tolerance);
    std::vector<char> used(pieces.size(), 0);
    std::vector<Loop> loops;
    for (std::size_t first = 0; first < pieces.size(); ++first) {
        Loop loop;
        int at = static_cast<int>(first);
        while (at >= 0 && !used[at]) {
            used[at] = 1;
            const Piece& p = pieces[at];
            loop.area += 0.5 * (p.from[0] * p.to[1] - p.from[1] * p.to[0]);
            loop.pieces.push_back(at);
            at = starts.find(p.to);
        }
        if (at == static_cast<int>(first) && loop.pieces.size() > 2) loops.push_back(loop);
    }
    return loops;
}

bool inside(const std::vector<Piece>& pieces, const Loop& loop, double x, double y) {
    bool in = false;
    for (const int i : loop.pieces) {
        const Piece& p = pieces[i];
        if ((p.from[1] > y) == (p.to[1] > y)) continue;
        const double at =
            p.from[0] + (y - p.from[1]) / (p.to[1] - p.from[1]) * (p.to[0] - p.from[0]);
        if (at > x) in = !in;
    }
    return in;
}

/// revolved: the innermost disc of gas round the axis at height z, or the ring about a pillar.
std::optional<Measured> area_between_rings(const Domain& domain, const Surface& surface,
                                           const FeatureSite& site, double z) {
    const Section section(domain, surface, 0, 0, 0, site.width_x);
    double square = 0; // of the radius of a disc of the same area
    Measured m;
    for (const Section::Crossing& wall : section.level(z)) { // outwards
        if (wall.u <= 0) continue;
        const bool gas_inside = wall.piece->z1 > wall.piece->z0;
        square += gas_inside ? wall.u * wall.u : -wall.u * wall.u;
        m.elements.emplace_back(wall.piece->element, 2 * wall.u / std::fabs(wall.piece->normal_u));
        if (gas_inside) break;
    }
    if (!(square > 0)) return {};
    m.value = 2 * std::sqrt(square);
    // Solid that moves out by d takes d / |n.u| from the gas on either side of the ring.
    for (auto& [element, weight] : m.elements)
        weight *= -1 / std::sqrt(square);
    return m;
}

} // namespace

std::optional<Measured> cd_area_at(const Domain& domain, const Surface& surface,
                                   const FeatureSite& site, double z) {
    if (domain.extruded()) return {};
    if (domain.revolved()) return area_between_rings(domain, surface, site, z);
    const std::vector<Piece> pieces =
        with_images(domain, level_cut(surface, z, 1e-9 * domain.spacing), site);
    const std::vector<Loop> loops = closed_loops(pieces, 1e-7 * domain.spacing);
    const Loop* opening = nullptr;
    for (const Loop& loop : loops)
        if (loop.area > 0 && inside(pieces, loop, site.centre_x, site.centre_y) &&
            (!opening || loop.area < opening->area))
            opening = &loop;
    if (!opening) return {};
    double area = opening->area;
    std::vector<const Loop*> rims{opening};
    for (const Loop& loop : loops) { // pillars left standing in the opening
        const Piece& p = pieces[loop.pieces.front()];
        if (loop.area < 0 && inside(pieces, *opening, p.from[0], p.from[1])) {
            area += loop.area;
            rims.push_back(&loop);
        }
    }
    if (area <= 0) return {};
    Measured m{2 * std::sqrt(area / pi), {}};
    // An element that moves out by d takes length * d / |n in the plane| from the area.
    for (const Loop* rim : rims)
        for (const int i : rim->pieces) {
            const Piece& p = pieces[i];
            const double length = std::hypot(p.to[0] - p.from[0], p.to[1] - p.from[1]);
            m.elements.emplace_back(p.element, -length / p.level_normal / std::sqrt(pi * area));
        }
    return m;
}

} // namespace rille::geometry
