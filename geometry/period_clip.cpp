// SPDX-License-Identifier: Apache-2.0
#include "geometry/period_clip.hpp"

#include <algorithm>
#include <cmath>
#include <map>

namespace rille::geometry {

namespace {

using Polygon = std::vector<int>;

class Clipper {
public:
    Clipper(const Domain& domain, std::vector<Vec3>& vertices)
        : limit_{0.5 * domain.width_x(), 0.5 * domain.width_y()}, vertices_(vertices) {}

    bool inside(int v) const {
        return std::fabs(vertices_[v].x) <= limit_[0] && std::fabs(vertices_[v].y) <= limit_[1];
    }

    /// The parts of a convex planar polygon, all inside the period.
    std::vector<Polygon> clip(const Polygon& polygon) {
        std::vector<Polygon> parts{polygon};
        for (int axis = 0; axis < 2; ++axis)
            for (int side = -1; side <= 1; side += 2) {
                std::vector<Polygon> next;
                for (const Polygon& p : parts)
                    split(p, axis, side, next);
                parts = std::move(next);
            }
        return parts;
    }

private:
    double beyond(int v, int axis, int side) const {
        return side * vertices_[v][axis] - limit_[axis];
    }

    void split(const Polygon& p, int axis, int side, std::vector<Polygon>& out) {
        bool any_out = false, any_in = false;
        for (int v : p) {
            any_out = any_out || beyond(v, axis, side) > 0;
            any_in = any_in || beyond(v, axis, side) < 0;
        }
        if (!any_out) return out.push_back(p);
        Polygon kept, moved;
        for (std::size_t n = 0; n < p.size(); ++n) {
            const int a = p[n], b = p[(n + 1) % p.size()];
            const double da = beyond(a, axis, side), db = beyond(b, axis, side);
            if (da <= 0) kept.push_back(a);
            if (da >= 0) moved.push_back(a);
            if (da * db < 0) {
                const int c = cut(a, b, axis, side);
                kept.push_back(c);
                moved.push_back(c);
            }
        }
        if (any_in && kept.size() > 2) out.push_back(kept);
        for (int& v : moved)
            v = shift(v, axis, side);
        if (moved.size() > 2) out.push_back(moved);
    }

    int cut(int a, int b, int axis, int side) {
        if (a > b) std::swap(a, b); // the same point from both elements at the edge
        int& known =
            cuts_.emplace(std::array<int, 3>{a, b, 2 * axis + (side > 0)}, -1).first->second;
        if (known < 0) {
            const Vec3 pa = vertices_[a], pb = vertices_[b];
            Vec3 p = pa + (pb - pa) * ((side * limit_[axis] - pa[axis]) / (pb[axis] - pa[axis]));
            p[axis] = side * limit_[axis];
            known = add(p);
        }
        return known;
    }

    int shift(int v, int axis, int side) {
        int& known =
            shifts_.emplace(std::array<int, 2>{v, 2 * axis + (side > 0)}, -1).first->second;
        if (known < 0) {
            Vec3 p = vertices_[v];
            p[axis] = beyond(v, axis, side) > 0 ? p[axis] - 2 * side * limit_[axis]
                                                : -side * limit_[axis];
            known = add(p);
        }
        return known;
    }

    int add(const Vec3& p) {
        vertices_.push_back(p);
        return static_cast<int>(vertices_.size()) - 1;
    }

    double limit_[2];
    std::vector<Vec3>& vertices_;
    std::map<std::array<int, 3>, int> cuts_;
    std::map<std::array<int, 2>, int> shifts_;
};

/// Drops vertices that no element uses any more.
void compact(Surface& s) {
    std::vector<int> number(s.vertices.size(), -1);
    for (const auto& c : s.corners)
        for (int v : c)
            number[v] = 0;
    int count = 0;
    for (std::size_t v = 0; v < number.size(); ++v)
        if (number[v] == 0) {
            number[v] = count;
            s.vertices[count++] = s.vertices[v];
        }
    s.vertices.resize(count);
    for (auto& c : s.corners)
        for (int& v : c)
            v = number[v];
}

} // namespace

std::vector<int> clip_to_period(const Domain& domain, Surface& s) {
    Clipper clipper(domain, s.vertices);
    std::vector<std::array<int, 4>> corners;
    std::vector<int> origin;
    corners.reserve(s.corners.size());
    origin.reserve(s.corners.size());
    bool clipped = false;
    for (std::size_t e = 0; e < s.corners.size(); ++e) {
        const std::array<int, 4> c = s.corners[e];
        if (std::all_of(c.begin(), c.end(), [&](int v) { return clipper.inside(v); })) {
            corners.push_back(c);
            origin.push_back(static_cast<int>(e));
            continue;
        }
        clipped = true;
        for (const Polygon& half : {Polygon{c[0], c[1], c[2]}, Polygon{c[0], c[2], c[3]}})
            for (const Polygon& p : clipper.clip(half))
                for (std::size_t n = 2; n < p.size(); n += 2) { // fan of quads, last a triangle
                    const int last = n + 1 < p.size() ? p[n + 1] : p[n];
                    corners.push_back({p[0], p[n - 1], p[n], last});
                    origin.push_back(static_cast<int>(e));
                }
    }
    s.corners = std::move(corners);
    if (clipped) compact(s);
    return origin;
}

} // namespace rille::geometry
