// SPDX-License-Identifier: Apache-2.0
#include "geometry/carry_arc_map.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double corner_cosine = 0.9; ///< neighbours that turn by more meet in a corner
constexpr double pin_reach = 0.75;    ///< [mean elements] corners are the same if no farther apart
constexpr double window = 2.5;        ///< [mean elements] a direction is taken over, to either side

double mean_length(const Surface& s) {
    double sum = 0;
    for (int e = 0; e < static_cast<int>(s.size()); ++e)
        sum += s.length(e);
    return sum / s.size();
}

double turn(const Vec3& before, const Vec3& after) {
    return before.z * after.x - before.x * after.z;
}

} // namespace

ArcMap::ArcMap(const CarryTask& task)
    : task_(task), from_(task.from), to_(task.to), mean_(mean_length(task.to)),
      bins_(task.to.centre, 1.5 * mean_, task.period_x, 0) {
    list_chains();
    move_vertices();
    locate();
    pin_corners();
}

void ArcMap::list_chains() {
    arc_.resize(to_.size() + 1, 0);
    chain_of_.resize(to_.size());
    longest_ = 0;
    for (int e = 0; e < static_cast<int>(to_.size()); ++e) {
        if (e == 0 || to_.chain[e] != to_.chain[e - 1]) chains_.push_back({e, e, false, 0});
        chain_of_[e] = static_cast<int>(chains_.size()) - 1;
        chains_.back().last = e + 1;
        arc_[e + 1] = arc_[e] + to_.length(e);
        longest_ = std::max(longest_, to_.length(e));
    }
    for (ArcChain& c : chains_) {
        c.closed = to_.next[c.last - 1] == c.first;
        c.length = arc_[c.last] - arc_[c.first];
    }
}

/// Where the start and the end of each old element have moved to, so that neighbours stay
/// joined and both keep their distance.
void ArcMap::move_vertices() {
    const int size = static_cast<int>(from_.size());
    start_.resize(size);
    end_.resize(size);
    for (int e = 0; e < size; ++e) {
        const int before = from_.previous[e], after = from_.next[e];
        start_[e] = from_.vertices[from_.corners[e][0]] + displacement(before, e);
        end_[e] = from_.vertices[from_.corners[e][1]] + displacement(e, after);
    }
}

Vec3 ArcMap::displacement(int a, int b) const {
    if (a < 0 || b < 0) { // on a mirror side: along it
        const int e = a < 0 ? b : a;
        const double nz = from_.normal[e].z;
        const double rise = std::fabs(nz) > 0.3 ? -task_.moved[e] / nz : 0;
        return Vec3(0, 0, rise);
    }
    const Vec3 na = from_.normal[a], nb = from_.normal[b];
    const double ma = task_.moved[a], mb = task_.moved[b];
    const double c = na.dot(nb), determinant = 1 - c * c;
    if (c > corner_cosine) return direction(a, b) * (-0.5 * (ma + mb));
    if (determinant < 0.05) return (na * ma + nb * mb) * -0.5;
    return (na * (ma - c * mb) + nb * (mb - c * ma)) * (-1 / determinant);
}

/// Walks from the start (`back`) or the end of a stretch over elements until `length` is used
/// up or a corner comes, mirrored at a mirror side; visit(normal, length) for each. Returns the
/// length walked.
template <class Visit>
double ArcMap::walk(int e, bool back, double length, const Visit& visit) const {
    double done = 0, side = 1;
    Vec3 normal = from_.normal[e];
    // There and back at most: a piece of no length would go round for ever.
    for (std::size_t seen = 0; done < length && seen < 2 * from_.size(); ++seen) {
        const double part = std::min(from_.length(e), length - done);
        visit(normal, part);
        done += part;
        const int next = back ? from_.previous[e] : from_.next[e];
        if (next < 0) {
            back = !back;
            side = -side;
        } else {
            e = next;
        }
        const Vec3& n = from_.normal[e];
        const Vec3 ahead(side * n.x, n.y, n.z);
        if (ahead.dot(normal) < corner_cosine) break;
        normal = ahead;
    }
    return done;
}

/// Normal where element a ends and b starts, off corners: that of the chord over an equal
/// stretch to either side. Single elements lean by hundredths, and what is carried along their
/// normals would drift to and fro.
Vec3 ArcMap::direction(int a, int b) const {
    const auto nothing = [](const Vec3&, double) {};
    const double left = walk(a, true, window * mean_, nothing);
    const double reach = std::min(left, walk(b, false, left, nothing));
    Vec3 sum(0, 0, 0);
    const auto add = [&sum](const Vec3& n, double length) { sum += n * length; };
    walk(a, true, reach, add);
    walk(b, false, reach, add);
    return sum / sum.length();
}

Place ArcMap::place(const Vec3& p) const {
    Place best;
    double best2 = 1e300;
    for (double radius = 1.5 * mean_; best.element < 0 || best2 > radius * radius; radius *= 2) {
        bins_.near(p, radius + longest_, [&](int e, const Vec3&) {
            const Vec3 a = to_.vertices[to_.corners[e][0]], b = to_.vertices[to_.corners[e][1]];
            const Vec3 along = b - a;
            const double t = std::clamp(nearest(p - a).dot(along) / along.length2(), 0.0, 1.0);
            const Vec3 foot = a + along * t;
            const Vec3 d = nearest(foot - p);
            const double d2 = d.length2();
            if (d2 < best2 || (d2 == best2 && e < best.element)) {
                best2 = d2;
                best.element = e;
                best.chain = chain_of_[e];
                best.arc = t >= 1 ? arc_[e + 1] : arc_[e] + t * to_.length(e);
            }
        });
        if (radius > 1e9 * mean_) break;
    }
    return best;
}

Vec3 ArcMap::nearest(Vec3 d) const {
    if (task_.period_x > 0) d.x -= task_.period_x * std::round(d.x / task_.period_x);
    return d;
}

void ArcMap::locate() {
    const int size = static_cast<int>(from_.size());
    low_.resize(size);
    high_.resize(size);
    for (int e = 0; e < size; ++e) {
        const int before = from_.previous[e];
        low_[e] = before == e - 1 && before >= 0 ? high_[before] : place(start_[e]);
        high_[e] = place(end_[e]);
        snap(low_[e], before < 0);
        snap(high_[e], false, from_.next[e] < 0);
    }
    for (int e = 0; e < size; ++e) { // joined across the seam of a loop
        const int before = from_.previous[e];
        if (before >= 0 && before != e - 1) high_[before] = low_[e];
    }
}

/// The ends of a chain stay its ends.
void ArcMap::snap(Place& p, bool start, bool end) const {
    if (p.element < 0) return;
    const ArcChain& c = chains_[p.chain];
    if (c.closed) return;
    if (start && p.element == c.first) p.arc = arc_[c.first];
    if (end && p.element == c.last - 1) p.arc = arc_[c.last];
}

/// How far b lies ahead of a on their common chain, the short way round a loop.
double ArcMap::ahead(const Place& a, const Place& b) const {
    const ArcChain& c = chains_[a.chain];
    double length = b.arc - a.arc;
    if (c.closed) {
        if (length > 0.5 * c.length) length -= c.length;
        if (length < -0.5 * c.length) length += c.length;
    }
    return length;
}

bool ArcMap::is_corner(const Surface& s, int e) {
    return s.next[e] >= 0 && s.normal[e].dot(s.normal[s.next[e]]) < corner_cosine;
}

/// Corners go to corners: what lies on one side of an edge stays on that side, though the
/// contour finds corners to a few hundredths of a cell only.
void ArcMap::pin_corners() {
    std::vector<int> corners;
    for (int j = 0; j < static_cast<int>(to_.size()); ++j)
        if (is_corner(to_, j)) corners.push_back(j);
    for (int e = 0; e < static_cast<int>(from_.size()); ++e) {
        if (!is_corner(from_, e)) continue;
        const double sense = turn(from_.normal[e], from_.normal[from_.next[e]]);
        int best = -1;
        double best2 = pin_reach * pin_reach * mean_ * mean_;
        for (const int j : corners) {
            const double d2 = nearest(to_.vertices[to_.corners[j][1]] - end_[e]).length2();
            if (d2 >= best2 || sense * turn(to_.normal[j], to_.normal[to_.next[j]]) <= 0) continue;
            best2 = d2;
            best = j;
        }
        if (best >= 0) pin(e, {chain_of_[best], arc_[best + 1], best});
    }
}

/// The end of old element e goes to `corner`; vertices next to it must not pass it.
void ArcMap::pin(int e, const Place& corner) {
    const auto passed = [&](const Place& p, double sign) {
        if (p.chain != corner.chain) return false;
        const double by = sign * ahead(corner, p);
        return by > 0 && by < 4 * mean_;
    };
    high_[e] = low_[from_.next[e]] = corner;
    for (int f = from_.next[e]; f >= 0 && f != e && passed(high_[f], -1); f = from_.next[f]) {
        high_[f] = corner;
        if (from_.next[f] >= 0) low_[from_.next[f]] = corner;
    }
    for (int f = e; f >= 0 && f != from_.next[e] && passed(low_[f], 1); f = from_.previous[f]) {
        low_[f] = corner;
        if (from_.previous[f] >= 0) high_[from_.previous[f]] = corner;
    }
}

bool ArcMap::covered(int e, double& length) const {
    const Place &a = low_[e], &b = high_[e];
    if (a.chain != b.chain) return false;
    length = ahead(a, b);
    return std::fabs(length) <= 3 * from_.length(e) + 4 * std::fabs(task_.moved[e]) + 4 * mean_;
}

} // namespace rille::geometry
