// SPDX-License-Identifier: Apache-2.0
#include "fluxes/open_sky.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

/// Angle from the vertical of the direction (x, z), moved by whole turns next to `near`.
double angle_near(double x, double z, double near) {
    const double angle = std::atan2(x, z);
    return angle + 2 * pi * std::round((near - angle) / (2 * pi));
}

/// Part of the sky of `plane` over [low, high] of alpha + beta tan(phi) where that is positive.
double positive_part(const InPlane& plane, double alpha, double beta, double low, double high) {
    const auto sign = [&](double phi) { return alpha * std::cos(phi) + beta * std::sin(phi); };
    const bool at_low = sign(low) > 0, at_high = sign(high) > 0;
    if (!at_low && !at_high) return 0.0;
    if (at_low != at_high) {
        const double root =
            std::clamp(std::atan2(beta < 0 ? alpha : -alpha, std::fabs(beta)), low, high);
        (at_low ? high : low) = root;
    }
    const InPlane::Below above = plane.below(high), below = plane.below(low);
    return alpha * (above.share - below.share) + beta * (above.moment - below.moment);
}

} // namespace

OpenSky::OpenSky(const geometry::Domain& domain, const geometry::Surface& surface) {
    RILLE_CHECK(domain.extruded(), "the sky by strings is two-dimensional");
    period_ = domain.width_x();
    mirror_ = domain.sides == geometry::Sides::mirror;
    x_min_ = domain.x_min();
    length_ = surface.area;
    cosine_.angle = {-0.5 * pi, 0.5 * pi}; // uniform in the sine
    cosine_.share = {0, 1};
    cosine_.moment = {0, 0};
    UnrolledChain chain = unroll(domain, surface);
    point_ = std::move(chain.point);
    position_ = std::move(chain.position);
    unwrap_normals();
    const std::size_t n = point_.size();
    std::vector<double> start(n, 0.0);
    for (std::size_t i = 1; i < n; ++i)
        start[i] = normal_[i - 1] - 0.5 * pi;
    left_ = pull(point_, start);
    reflected_.resize(n);
    for (std::size_t i = 0; i < n; ++i)
        reflected_[i] = {-point_[n - 1 - i].x, point_[n - 1 - i].z};
    for (std::size_t i = 1; i < n; ++i)
        start[i] = -(normal_[n - 1 - i] + 0.5 * pi);
    right_ = pull(reflected_, start);
    find_floating(domain, surface);
}

void OpenSky::unwrap_normals() {
    normal_.resize(point_.size() - 1);
    for (std::size_t i = 0; i < normal_.size(); ++i) {
        const double x = point_[i + 1].x - point_[i].x, z = point_[i + 1].z - point_[i].z;
        normal_[i] = angle_near(-z, x, i == 0 ? 0.0 : normal_[i - 1]);
    }
}

OpenSky::Strings OpenSky::pull(const std::vector<Point>& point,
                               const std::vector<double>& start_angle) {
    const int n = static_cast<int>(point.size());
    Strings strings{std::vector<int>(n, -1), std::vector<double>(n, -0.5 * pi)};
    for (int i = 1; i < n; ++i) {
        const Tangent t = tangent(point, strings, point[i], {i - 1, start_angle[i]});
        strings.parent[i] = t.vertex;
        strings.angle[i] = t.angle;
    }
    return strings;
}

/// Tangent from a point to the surface that ends at `nearest.vertex`. To the right of that vertex's
/// string it touches the string; to the left of it, other parts of the surface may stand out.
OpenSky::Tangent OpenSky::tangent(const std::vector<Point>& point, const Strings& strings,
                                  const Point& from, Tangent nearest) {
    if (nearest.angle + pi < strings.angle[nearest.vertex]) return farthest(point, from, nearest);
    while (strings.parent[nearest.vertex] >= 0 && strings.angle[nearest.vertex] > nearest.angle) {
        // Going along the string to its vertex turns the view of the next by less than pi.
        const double near = strings.angle[nearest.vertex];
        nearest.vertex = strings.parent[nearest.vertex];
        const Point& p = point[nearest.vertex];
        nearest.angle = angle_near(p.x - from.x, p.z - from.z, near);
    }
    return nearest;
}

/// The same by a walk over the whole surface to that side, largest unwrapped angle. A turn is
/// counted where the view crosses straight down, angles within a turn compare by cross products.
OpenSky::Tangent OpenSky::farthest(const std::vector<Point>& point, const Point& from,
                                   const Tangent& nearest) {
    Point view{point[nearest.vertex].x - from.x, point[nearest.vertex].z - from.z};
    int turns =
        static_cast<int>(std::lround((nearest.angle - std::atan2(view.x, view.z)) / (2 * pi)));
    Point best = view;
    int best_turns = turns, best_vertex = nearest.vertex;
    for (int v = nearest.vertex - 1; v >= 0; --v) {
        const Point next{point[v].x - from.x, point[v].z - from.z};
        const bool was_right = view.x >= 0, is_right = next.x >= 0;
        if (was_right != is_right && view.z + view.x / (view.x - next.x) * (next.z - view.z) < 0)
            turns += is_right ? -1 : 1;
        view = next;
        bool larger = turns > best_turns;
        if (turns == best_turns)
            larger = is_right != (best.x >= 0) ? is_right : view.x * best.z - view.z * best.x > 0;
        if (!larger) continue;
        best = view;
        best_turns = turns;
        best_vertex = v;
    }
    return {best_vertex, std::atan2(best.x, best.z) + 2 * pi * best_turns};
}

double OpenSky::flux(const InPlane& plane, int element) const {
    if (!lit_[element]) return 0.0;
    if (floating_pieces()) return flux_by_points(plane, element);
    return flux_by_strings(plane, position_[element]) / length_[element];
}

/// The rays of in-plane angle phi that land on a segment fill the gap between the left string and
/// the right string, measured across the rays. Between the angles at which the strings leave one
/// vertex for the next, that gap is linear in tan(phi), which the tables integrate exactly.
double OpenSky::flux_by_strings(const InPlane& plane, int position) const {
    const int last = static_cast<int>(point_.size()) - 1;
    std::vector<int> left = {position}, right = {position + 1};
    std::vector<double> left_from, right_to; // angle at which each vertex hands over to the next
    for (int v = position; v >= 0; v = left_.parent[v]) {
        const double before = left_from.empty() ? HUGE_VAL : left_from.back();
        left_from.push_back(std::min(before, left_.parent[v] < 0 ? -HUGE_VAL : left_.angle[v]));
        if (left_.parent[v] >= 0) left.push_back(left_.parent[v]);
        if (left_from.back() < -0.5 * pi) break;
    }
    for (int v = last - (position + 1); v >= 0; v = right_.parent[v]) {
        const double before = right_to.empty() ? -HUGE_VAL : right_to.back();
        right_to.push_back(std::max(before, right_.parent[v] < 0 ? HUGE_VAL : -right_.angle[v]));
        if (right_.parent[v] >= 0) right.push_back(last - right_.parent[v]);
        if (right_to.back() > 0.5 * pi) break;
    }
    double sum = 0, phi = -0.5 * pi;
    std::size_t l = left_from.size() - 1, r = 0;
    while (phi < 0.5 * pi) {
        while (l > 0 && left_from[l - 1] <= phi)
            --l;
        while (r + 1 < right_to.size() && right_to[r] <= phi)
            ++r;
        double to = 0.5 * pi;
        if (l > 0) to = std::min(to, left_from[l - 1]);
        if (r + 1 < right_to.size()) to = std::min(to, right_to[r]);
        const Point &a = point_[left[l]], &b = point_[right[r]];
        sum += positive_part(plane, b.x - a.x, a.z - b.z, phi, to);
        phi = to;
    }
    return sum;
}

std::vector<Visible> OpenSky::visible(int element, double part) const {
    if (!lit_[element]) return {};
    if (floating_pieces()) return visible_by_segments(element, part);
    const int i = position_[element], last = static_cast<int>(point_.size()) - 1;
    const Point &a = point_[i], &b = point_[i + 1];
    const Point here{a.x + part * (b.x - a.x), a.z + part * (b.z - a.z)};
    Visible seen{-0.5 * pi, 0.5 * pi};
    if (i > 0) {
        const Point& p = point_[i - 1];
        const double angle = angle_near(p.x - here.x, p.z - here.z, normal_[i] - 0.5 * pi);
        seen.low = std::max(seen.low, tangent(point_, left_, here, {i - 1, angle}).angle);
    }
    if (i + 2 <= last) {
        const Point& p = point_[i + 2];
        const double angle = angle_near(here.x - p.x, p.z - here.z, -(normal_[i] + 0.5 * pi));
        const Point flipped{-here.x, here.z};
        seen.high = std::min(seen.high,
                             -tangent(reflected_, right_, flipped, {last - (i + 2), angle}).angle);
    }
    if (!(seen.low < seen.high)) return {};
    return {seen};
}

/// Chains other than 0: clockwise around solid = a piece of solid; it floats in the gas if it lies
/// above chain 0 rather than in a closed void.
void OpenSky::find_floating(const geometry::Domain&, const geometry::Surface& surface) {
    const int count = static_cast<int>(surface.size());
    lit_.assign(count, 0);
    int chains = 0;
    for (int e = 0; e < count; ++e) {
        const auto& c = surface.corners[e];
        segment_.push_back({{surface.vertices[c[0]].x, surface.vertices[c[0]].z},
                            {surface.vertices[c[1]].x, surface.vertices[c[1]].z}});
        if (!mirror_) {
            double& to = segment_.back().b.x;
            to += period_ * std::round((segment_.back().a.x - to) / period_);
        }
        lit_[e] = surface.chain[e] == 0;
        chains = std::max(chains, surface.chain[e] + 1);
    }
    for (int chain = 1; chain < chains; ++chain) {
        int member = -1;
        for (int e = 0; e < count && member < 0; ++e)
            if (surface.chain[e] == chain) member = e;
        if (member < 0) continue;
        // Straight up from a point of the piece: an even number of crossings of chain 0 means that
        // it lies on the gas side of it. (What a floating piece encloses is hidden by the piece.)
        const Point from{0.5 * (segment_[member].a.x + segment_[member].b.x),
                         0.5 * (segment_[member].a.z + segment_[member].b.z)};
        int crossings = 0;
        for (int e = 0; e < count; ++e) {
            if (surface.chain[e] != 0) continue;
            for (int k = -1; k <= 1; ++k) {
                const double ax = segment_[e].a.x + k * period_, bx = segment_[e].b.x + k * period_;
                if (mirror_ && k != 0) continue;
                if ((ax <= from.x) == (bx <= from.x)) continue;
                const double t = (from.x - ax) / (bx - ax);
                if (segment_[e].a.z + t * (segment_[e].b.z - segment_[e].a.z) > from.z) ++crossings;
            }
        }
        if (crossings % 2 != 0) continue;
        for (int e = 0; e < count; ++e)
            if (surface.chain[e] == chain) {
                lit_[e] = 1;
                floating_.push_back(e);
            }
    }
}

std::vector<Visible> OpenSky::visible_by_segments(int element, double part) const {
    constexpr int images = 4;
    const Segment& own = segment_[element];
    const Point here{own.a.x + part * (own.b.x - own.a.x), own.a.z + part * (own.b.z - own.a.z)};
    std::vector<Visible> hidden;
    const auto hide = [&](Point a, Point b) {
        double from = std::atan2(a.x - here.x, a.z - here.z);
        double to = from + std::remainder(std::atan2(b.x - here.x, b.z - here.z) - from, 2 * pi);
        if (from > to) std::swap(from, to);
        hidden.push_back({from, to});
        if (from < -pi) hidden.push_back({from + 2 * pi, to + 2 * pi});
        if (to > pi) hidden.push_back({from - 2 * pi, to - 2 * pi});
    };
    for (std::size_t e = 0; e < segment_.size(); ++e) {
        if (!lit_[e]) continue;
        const Segment& s = segment_[e];
        for (int k = -images; k <= images; ++k) {
            if (k == 0 && static_cast<int>(e) == element) continue;
            const double shift = k * period_;
            if (!mirror_ || k % 2 == 0) {
                hide({s.a.x + shift, s.a.z}, {s.b.x + shift, s.b.z});
            } else {
                const double centre = 2 * (x_min_ + period_) + shift - period_;
                hide({centre - s.a.x, s.a.z}, {centre - s.b.x, s.b.z});
            }
        }
    }
    std::sort(hidden.begin(), hidden.end(), [](const Visible& a, const Visible& b) {
        return a.low != b.low ? a.low < b.low : a.high < b.high;
    });
    std::vector<Visible> seen;
    double from = -0.5 * pi;
    for (const Visible& h : hidden) {
        if (h.low > from && from < 0.5 * pi) seen.push_back({from, std::min(h.low, 0.5 * pi)});
        from = std::max(from, h.high);
    }
    if (from < 0.5 * pi) seen.push_back({from, 0.5 * pi});
    return seen;
}

double OpenSky::flux_by_points(const InPlane& plane, int element) const {
    constexpr int points = 8;
    const Segment& own = segment_[element];
    const double x = own.b.x - own.a.x, z = own.b.z - own.a.z;
    double sum = 0;
    for (int i = 0; i < points; ++i)
        for (const Visible& v : visible_by_segments(element, (i + 0.5) / points))
            sum += positive_part(plane, x, -z, v.low, v.high) / points;
    return sum / length_[element];
}

} // namespace rille::fluxes
