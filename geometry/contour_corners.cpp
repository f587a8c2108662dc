// SPDX-License-Identifier: Apache-2.0
#include "geometry/contour.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double window = 2.1;  ///< [cells] length of the fitted pieces
constexpr double reach = 6.5;   ///< [cells] of contour needed on either side
constexpr double spacing = 2.3; ///< [cells] least arc between two corners
constexpr double threshold = pi / 6;
constexpr double same_arc = 1e-9; ///< [cells] a point at the corner belongs to neither side

/// Closer to a corner than this [cells] an edge of the grid may end nearer to the other face than
/// to the one it crosses (bisector of the corner), so that phi along it bends.
double disturbed(double turned) {
    return 1.05 * std::clamp(std::tan(0.5 * std::min(std::fabs(turned), 3.0)), 1.0, 3.0);
}

double turn(const Vec3& from, const Vec3& to) { // left turns positive, in (-pi, pi]
    return std::atan2(from.x * to.z - from.z * to.x, from.x * to.x + from.z * to.z);
}

/// A chain continued beyond its ends, by reflection at mirror sides or round the loop, with arc
/// lengths in cells from the first point.
struct Padded {
    std::vector<Vec3> p;
    std::vector<double> s;
    std::vector<int> source; ///< index in the chain, -1 in the padding of an open chain
    double length = 0;       ///< arc of the chain itself, with its closing segment

    Padded(const ContourChain& chain, double h) {
        const auto& points = chain.points;
        const int size = static_cast<int>(points.size());
        std::vector<Vec3> before, after;
        double left = 0, right = 0;
        for (int n = 1; n < size && (left < reach * h || right < reach * h); ++n) {
            const Vec3 head = points.front().p, tail = points.back().p, shift(chain.shift, 0, 0);
            Vec3 a, b;
            if (chain.closed) {
                a = points[size - n].p - shift;
                b = points[n - 1].p + shift;
            } else {
                a = points[n].p;
                a.x = 2 * head.x - a.x;
                b = points[size - 1 - n].p;
                b.x = 2 * tail.x - b.x;
            }
            left += (a - (before.empty() ? head : before.back())).length();
            right += (b - (after.empty() ? tail : after.back())).length();
            before.push_back(a);
            after.push_back(b);
        }
        for (auto it = before.rbegin(); it != before.rend(); ++it)
            add(*it, -1);
        for (int n = 0; n < size; ++n)
            add(points[n].p, n);
        for (std::size_t n = 0; n < after.size(); ++n)
            add(after[n], chain.closed ? static_cast<int>(n) : -1);
        measure(before.size(), size, chain, h);
    }

    Vec3 at(double arc) const {
        const auto it = std::upper_bound(s.begin() + 1, s.end() - 1, arc);
        const std::size_t n = it - s.begin();
        const double length = s[n] - s[n - 1];
        const double t = length > 0 ? (arc - s[n - 1]) / length : 0;
        return p[n - 1] + (p[n] - p[n - 1]) * std::clamp(t, 0.0, 1.0);
    }

private:
    void add(const Vec3& q, int from) {
        p.push_back(q);
        source.push_back(from);
    }
    void measure(std::size_t head, int size, const ContourChain& chain, double h) {
        s.assign(p.size(), 0);
        for (std::size_t n = 1; n < p.size(); ++n)
            s[n] = s[n - 1] + (p[n] - p[n - 1]).length() / h;
        const double zero = s[head];
        for (double& arc : s)
            arc -= zero;
        length = chain.closed ? s[head + size] : s[head + size - 1];
    }
};

/// Turn at arc s that is not explained by curvature: tangents from chords beyond the disturbed
/// cells, minus what the smaller curvature of the two sides would turn in between.
double sharp_turn(const Padded& c, double s) {
    const Vec3 l1 = c.at(s - 0.75), l2 = c.at(s - 1.75), l3 = c.at(s - 2.75);
    const Vec3 r1 = c.at(s + 0.75), r2 = c.at(s + 1.75), r3 = c.at(s + 2.75);
    const double raw = turn(l1 - l2, r2 - r1);
    const double left = turn(l2 - l3, l1 - l2), right = turn(r2 - r1, r3 - r2);
    const double bend = left * right <= 0 ? 0 : std::fabs(left) < std::fabs(right) ? left : right;
    const double smooth = 2.5 * bend;
    if (smooth * raw <= 0) return raw;
    return std::fabs(smooth) >= std::fabs(raw) ? 0 : raw - smooth;
}

struct Line {
    Vec3 point, along;
    bool good = false;
};

struct RebuiltCorner {
    double s = 0;
    Vec3 p;
    Line left, right;
    double near = disturbed(0); ///< [cells]
};

/// Least-squares line through the points of one side (direction -1 or +1) beyond the disturbed
/// ones, no further than `limit` cells of arc.
Line fit_side(const Padded& c, const RebuiltCorner& corner, int direction, double h, double limit) {
    for (const double skip : {corner.near, 0.7 * corner.near, 0.4 * corner.near}) {
        const double far = corner.near + window, s = corner.s;
        Vec3 mean(0, 0, 0);
        std::vector<Vec3> used;
        const int start =
            static_cast<int>(std::lower_bound(c.s.begin(), c.s.end(), s) - c.s.begin());
        for (int n = direction > 0 ? start : start - 1; n >= 0 && n < static_cast<int>(c.p.size());
             n += direction) {
            const double arc = direction * (c.s[n] - s),
                         distance = (c.p[n] - corner.p).length() / h;
            if (arc > limit || arc > far + 1.5) break;
            if (arc < same_arc || distance < skip || distance > far) continue;
            used.push_back(c.p[n]);
            mean += c.p[n];
        }
        if (used.size() < 2) continue;
        mean /= static_cast<double>(used.size());
        double xx = 0, xz = 0, zz = 0;
        for (const Vec3& q : used) {
            const Vec3 d = q - mean;
            xx += d.x * d.x;
            xz += d.x * d.z;
            zz += d.z * d.z;
        }
        const double angle = 0.5 * std::atan2(2 * xz, xx - zz);
        Line line{mean, Vec3(std::cos(angle), 0, std::sin(angle)), true};
        const Vec3 walk = (used.back() - used.front()) * direction;
        if (walk.length() < 0.3 * h) continue;
        if (line.along.dot(walk) < 0) line.along = -line.along;
        return line;
    }
    return {};
}

/// Intersects the two fitted lines, refitting twice round the corner found.
bool intersect(const Padded& c, double h, double room_left, double room_right, RebuiltCorner& out) {
    out.p = c.at(out.s);
    const Vec3 raw = out.p;
    for (int round = 0; round < 3; ++round) {
        out.left = fit_side(c, out, -1, h, room_left);
        out.right = fit_side(c, out, +1, h, room_right);
        if (!out.left.good || !out.right.good) return false;
        const Vec3 a = out.left.along, b = out.right.along;
        const double sine = a.x * b.z - a.z * b.x;
        const double turned = turn(a, b);
        if (std::fabs(turned) < threshold || std::fabs(sine) < 0.1) return false;
        out.near = disturbed(turned);
        const Vec3 d = out.right.point - out.left.point;
        out.p = out.left.point + a * ((d.x * b.z - d.z * b.x) / sine);
        if ((out.p - raw).length() > 2.0 * out.near * h) return false;
    }
    return true;
}

/// Arcs of the largest sharp turns, at least `spacing` apart, in rising order.
std::vector<double> corner_arcs(const Padded& c) {
    struct Sample {
        double s, turn;
    };
    std::vector<Sample> samples;
    for (std::size_t n = 1; n < c.s.size(); ++n) {
        const double middle = 0.5 * (c.s[n - 1] + c.s[n]);
        if (middle < -spacing || middle > c.length + spacing) continue;
        const double size = std::fabs(sharp_turn(c, middle));
        if (size > threshold) samples.push_back({middle, size});
    }
    std::vector<double> arcs;
    while (!samples.empty()) {
        const auto best = std::max_element(samples.begin(), samples.end(),
                                           [](auto& a, auto& b) { return a.turn < b.turn; });
        const Sample top = *best;
        double sum = 0, low = top.s, high = top.s; // middle of the plateau round the maximum
        for (const Sample& q : samples)
            if (std::fabs(q.s - top.s) <= spacing && q.turn >= 0.9 * top.turn) {
                low = std::min(low, q.s);
                high = std::max(high, q.s);
            }
        sum = 0.5 * (low + high);
        arcs.push_back(sum);
        samples.erase(std::remove_if(samples.begin(), samples.end(),
                                     [&](const Sample& q) {
                                         return std::fabs(q.s - top.s) < spacing ||
                                                std::fabs(q.s - sum) < spacing;
                                     }),
                      samples.end());
    }
    std::sort(arcs.begin(), arcs.end());
    return arcs;
}

/// Moves a disturbed point onto the fitted line of its side; false if it lies beyond the corner.
bool settle(Vec3& p, double s, const RebuiltCorner& corner, double h) {
    const bool left = s < corner.s;
    const Line& line = left ? corner.left : corner.right;
    const double along = (p - corner.p).dot(line.along) * (left ? -1 : 1);
    if (along < 0.25 * h) return false;
    p = corner.p + line.along * (left ? -along : along);
    return true;
}

bool cross_each_other(const Vec3& a, const Vec3& b, const Vec3& c, const Vec3& d) {
    const auto side = [](const Vec3& p, const Vec3& q, const Vec3& r) {
        return (q.x - p.x) * (r.z - p.z) - (q.z - p.z) * (r.x - p.x);
    };
    return side(a, b, c) * side(a, b, d) < 0 && side(c, d, a) * side(c, d, b) < 0;
}

/// Index of a point where the line folds back on itself or crosses itself nearby, or -1. A contour
/// of phi never does: a fold is a corner fitted to pieces too short for it.
int find_fold(const std::vector<ContourPoint>& points) {
    constexpr double fold = 150 * pi / 180;
    constexpr int nearby = 12;
    const int size = static_cast<int>(points.size());
    for (int n = 1; n + 1 < size; ++n) {
        const Vec3 before = points[n].p - points[n - 1].p, after = points[n + 1].p - points[n].p;
        if (std::fabs(turn(before, after)) > fold) return n;
        for (int m = n + 1; m + 1 < size && m <= n + nearby; ++m)
            if (cross_each_other(points[n - 1].p, points[n].p, points[m].p, points[m + 1].p))
                return (n + m) / 2;
    }
    return -1;
}

/// The chain's points with the corners put in and the points that they disturb settled.
std::vector<ContourPoint> with_corners(const ContourChain& chain, const Padded& padded,
                                       const std::vector<RebuiltCorner>& corners,
                                       const Domain& domain) {
    const double h = domain.spacing, low = domain.x_min() + 0.3 * h,
                 high = domain.x_max() - 0.3 * h;
    std::vector<ContourPoint> rebuilt;
    const int size = static_cast<int>(chain.points.size());
    const int head = static_cast<int>(std::find(padded.source.begin(), padded.source.end(), 0) -
                                      padded.source.begin());
    std::size_t next = 0;
    const auto place = [&](double arc) { // corners of this loop that lie before `arc`
        for (; next < corners.size() && corners[next].s < arc; ++next) {
            const RebuiltCorner& c = corners[next];
            if (c.s < 0 || c.s >= padded.length) continue;
            if (!chain.closed && (c.p.x < low || c.p.x > high)) continue;
            rebuilt.push_back({c.p, true});
        }
    };
    for (int n = 0; n < size; ++n) {
        const double s = padded.s[head + n];
        place(s);
        ContourPoint q = chain.points[n];
        bool keep = true;
        for (const RebuiltCorner& c : corners) {
            if (std::fabs(s - c.s) > 2 * c.near || (q.p - c.p).length() > c.near * h) continue;
            if (!q.fixed)
                keep = settle(q.p, s, c, h) && keep;
            else if (std::fabs(c.p.x - q.p.x) < 0.3 * h)
                q.p.z = c.p.z;
        }
        if (keep) rebuilt.push_back(q);
    }
    place(padded.length);
    return rebuilt;
}

} // namespace

void rebuild_corners(ContourChain& chain, const Domain& domain) {
    const double h = domain.spacing;
    if (chain.points.size() < 4) return;
    const Padded padded(chain, h);
    const std::vector<double> arcs = corner_arcs(padded);
    std::vector<RebuiltCorner> corners;
    for (std::size_t m = 0; m < arcs.size(); ++m) {
        RebuiltCorner corner;
        corner.s = arcs[m];
        const double before = m > 0 ? arcs[m] - arcs[m - 1] : reach;
        const double after = m + 1 < arcs.size() ? arcs[m + 1] - arcs[m] : reach;
        if (intersect(padded, h, before - 0.5, after - 0.5, corner)) corners.push_back(corner);
    }
    while (!corners.empty()) {
        auto rebuilt = with_corners(chain, padded, corners, domain);
        const int fold = find_fold(rebuilt);
        if (fold < 0) {
            chain.points = std::move(rebuilt);
            return;
        }
        const Vec3 at = rebuilt[fold].p;
        corners.erase(std::min_element(corners.begin(), corners.end(),
                                       [&](const RebuiltCorner& a, const RebuiltCorner& b) {
                                           return (a.p - at).length() < (b.p - at).length();
                                       }));
    }
}

} // namespace rille::geometry
