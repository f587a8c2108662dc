// SPDX-License-Identifier: Apache-2.0
#include "fluxes/taut_strings.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

/// Adds a number to an expansion: numbers whose sum is exact and of which each is smaller than the
/// last place of the next.
/// Source: Shewchuk, Discrete Comput. Geom. 18, 305 (1997) [from memory].
template <std::size_t N>
void grow(std::array<double, N>& sum, std::size_t& count, double number) {
    for (std::size_t i = 0; i < count; ++i) {
        const double all = sum[i] + number, part = all - sum[i];
        sum[i] = (sum[i] - (all - part)) + (number - part);
        number = all;
    }
    sum[count++] = number;
}

/// Sign of cross() without round-off.
double exact_sign(const PlanePoint& a, const PlanePoint& b, const PlanePoint& c) {
    std::array<double, 12> sum{};
    std::size_t count = 0;
    const auto add = [&](double x, double y) {
        const double high = x * y;
        grow(sum, count, std::fma(x, y, -high));
        grow(sum, count, high);
    };
    add(b.x, c.z), add(-b.x, a.z), add(-a.x, c.z), add(-b.z, c.x), add(b.z, a.x), add(a.z, c.x);
    for (std::size_t i = count; i-- > 0;)
        if (sum[i] != 0) return sum[i];
    return 0;
}

/// Twice the area of the triangle a, b, c: positive where c lies to the left of a -> b. The sign is
/// exact: strings along straight walls go wrong where answers contradict each other.
double cross(const PlanePoint& a, const PlanePoint& b, const PlanePoint& c) {
    const double left = (b.x - a.x) * (c.z - a.z), right = (b.z - a.z) * (c.x - a.x);
    const double area = left - right;
    if (std::fabs(area) > 4e-16 * (std::fabs(left) + std::fabs(right))) return area;
    return left == 0 && right == 0 ? 0.0 : exact_sign(a, b, c);
}

} // namespace

/// Clips one convex corner after another off what is left of the polygon, a corner whose triangle
/// holds no other vertex. Only vertices that are no convex corners can lie in a triangle; they are
/// kept by columns of a grid.
class TautStrings::Clipping {
public:
    explicit Clipping(TautStrings& strings) : s_(strings), p_(strings.point_) {
        const int n = static_cast<int>(p_.size());
        next_.resize(n), previous_.resize(n), beyond_.assign(n, -1), concave_.assign(n, 0);
        for (int v = 0; v < n; ++v)
            next_[v] = (v + 1) % n, previous_[v] = (v + n - 1) % n;
        for (int v = 0; v < n; ++v)
            concave_[v] = !(corner_area(v) > 0);
        lay_out_cells();
    }

    void run() {
        int left = static_cast<int>(p_.size()), v = 0, since_last = 0;
        while (left > 3) {
            if (since_last > left) throw NumericsError("the open surface crosses itself");
            if (is_ear(v)) {
                clip(v);
                --left;
                since_last = 0;
                v = next_[next_[v]]; // every other one: triangles stay compact
            } else {
                ++since_last;
                v = next_[v];
            }
        }
        add(previous_[v], v, next_[v], beyond_[next_[v]]);
    }

private:
    double corner_area(int v) const { return cross(p_[previous_[v]], p_[v], p_[next_[v]]); }

    void lay_out_cells() {
        low_ = high_ = p_.front();
        for (const PlanePoint& q : p_) {
            low_ = {std::min(low_.x, q.x), std::min(low_.z, q.z)};
            high_ = {std::max(high_.x, q.x), std::max(high_.z, q.z)};
        }
        const double w = high_.x - low_.x, h = high_.z - low_.z;
        const double side = std::sqrt(std::max(w * h, 1e-300) / double(p_.size()));
        nx_ = std::clamp(int(w / side), 1, 512), nz_ = std::clamp(int(h / side), 1, 512);
        scale_ = {nx_ / std::max(w, 1e-300), nz_ / std::max(h, 1e-300)};
        cell_.assign(std::size_t(nx_) * nz_, {});
        for (int v = 0; v < int(p_.size()); ++v)
            if (concave_[v]) cell_[column(p_[v].x) + std::size_t(nx_) * row(p_[v].z)].push_back(v);
    }
    int column(double x) const { return std::clamp(int((x - low_.x) * scale_.x), 0, nx_ - 1); }
    int row(double z) const { return std::clamp(int((z - low_.z) * scale_.z), 0, nz_ - 1); }

    /// Whether no other vertex lies in the triangle at v or on its border.
    bool is_ear(int v) const {
        if (!(corner_area(v) > 0)) return false;
        const int a = previous_[v], c = next_[v];
        const PlanePoint &pa = p_[a], &pb = p_[v], &pc = p_[c];
        const int x0 = column(std::min({pa.x, pb.x, pc.x})), z0 = row(std::min({pa.z, pb.z, pc.z}));
        const int x1 = column(std::max({pa.x, pb.x, pc.x})), z1 = row(std::max({pa.z, pb.z, pc.z}));
        for (int z = z0; z <= z1; ++z)
            for (int x = x0; x <= x1; ++x)
                for (const int u : cell_[x + std::size_t(nx_) * z]) {
                    if (!concave_[u] || u == a || u == v || u == c) continue;
                    const PlanePoint& q = p_[u];
                    const double least =
                        std::min({cross(pa, pb, q), cross(pb, pc, q), cross(pc, pa, q)});
                    if (least >= 0) return false;
                }
        return true;
    }

    void clip(int v) {
        const int a = previous_[v], c = next_[v];
        beyond_[a] = add(a, v, c, -1);
        next_[a] = c, previous_[c] = a;
        concave_[v] = 0;
        for (const int u : {a, c})
            if (concave_[u] && corner_area(u) > 0) concave_[u] = 0;
    }

    /// beyond_[v]: triangle on the outer side of the edge that leaves v.
    int add(int a, int b, int c, int beyond_last) {
        const int t = static_cast<int>(s_.triangle_.size());
        s_.triangle_.push_back({{a, b, c}, {beyond_[a], beyond_[b], beyond_last}});
        for (const int other : s_.triangle_.back().neighbour) {
            if (other < 0) continue;
            // Its edge towards here is the last one, the cut by which it was clipped.
            s_.triangle_[other].neighbour[2] = t;
        }
        for (const int v : {a, b, c})
            s_.triangle_at_[v] = t;
        return t;
    }

    TautStrings& s_;
    const std::vector<PlanePoint>& p_;
    std::vector<int> next_, previous_, beyond_;
    std::vector<char> concave_;
    PlanePoint low_, high_, scale_;
    int nx_ = 1, nz_ = 1;
    std::vector<std::vector<int>> cell_;
};

TautStrings::TautStrings(std::vector<PlanePoint> polygon)
    : point_(std::move(polygon)), triangle_at_(point_.size(), -1) {
    RILLE_CHECK(point_.size() >= 3, "a polygon has three corners");
    triangle_.reserve(point_.size());
    Clipping(*this).run();
}

double TautStrings::turn(int a, int b, int c) const {
    return cross(point_[a], point_[b], point_[c]);
}

/// Strings from `apex` to the ends of an edge; walking across the edge into `triangle`, `left` and
/// `right` lie to either side.
struct TautStrings::Funnel {
    int triangle, left, right, apex;
};

/// Vertex at which the string to `to`, beyond the edge of the funnel, leaves the funnel, and on
/// which side it lies (-1 left, 0 the apex, 1 right): strings on the left turn left around their
/// vertices, those on the right turn right. Both sides are walked at once, so that the shorter way
/// decides the effort.
TautStrings::Touch TautStrings::tangent(const Funnel& f, int to,
                                        const std::vector<int>& parent) const {
    int left = f.left, right = f.right;
    while (left != f.apex || right != f.apex) {
        if (left != f.apex) {
            if (turn(parent[left], left, to) > 0) return {left, -1};
            left = parent[left];
        }
        if (right != f.apex) {
            if (turn(parent[right], right, to) < 0) return {right, 1};
            right = parent[right];
        }
    }
    return {f.apex, 0};
}

std::vector<double> TautStrings::lengths(int from) const {
    const auto distance = [&](int a, int b) {
        const double x = point_[b].x - point_[a].x, z = point_[b].z - point_[a].z;
        return std::sqrt(x * x + z * z);
    };
    std::vector<double> length(point_.size(), 0.0);
    std::vector<int> parent(point_.size(), -1);
    std::vector<Funnel> open;
    const Triangle& first = triangle_[triangle_at_[from]];
    for (int k = 0; k < 3; ++k) {
        const int a = first.corner[k], b = first.corner[(k + 1) % 3];
        if (a != from) parent[a] = from, length[a] = distance(from, a);
        if (first.neighbour[k] >= 0) open.push_back({first.neighbour[k], b, a, from});
    }
    while (!open.empty()) {
        const Funnel f = open.back();
        open.pop_back();
        const Triangle& t = triangle_[f.triangle];
        int k = 0; // the edge left -> right of t is the one that was crossed
        while (t.corner[k] != f.left || t.corner[(k + 1) % 3] != f.right)
            ++k;
        const int to = t.corner[(k + 2) % 3];
        const Touch touch = tangent(f, to, parent);
        parent[to] = touch.vertex;
        length[to] = length[touch.vertex] + distance(touch.vertex, to);
        const int past_right = t.neighbour[(k + 1) % 3], past_left = t.neighbour[(k + 2) % 3];
        if (past_right >= 0)
            open.push_back({past_right, to, f.right, touch.side > 0 ? touch.vertex : f.apex});
        if (past_left >= 0)
            open.push_back({past_left, f.left, to, touch.side < 0 ? touch.vertex : f.apex});
    }
    return length;
}

} // namespace rille::fluxes
