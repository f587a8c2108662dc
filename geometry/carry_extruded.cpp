// SPDX-License-Identifier: Apache-2.0
#include "geometry/carry.hpp"
#include "geometry/element_bins.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

/// A place on the new surface: an element's chain and the arc from that chain's start [nm].
struct Place {
    int chain = -1;
    double arc = 0;
    int element = -1;
};

struct Chain {
    int first = 0, last = 0; ///< elements [first, last)
    bool closed = false;
    double length = 0;
};

class ExtrudedCarrier {
public:
    explicit ExtrudedCarrier(const CarryTask& task)
        : task_(task), from_(task.from), to_(task.to), mean_(mean_length(task.to)),
          bins_(task.to.centre, 1.5 * mean_, task.period_x, 0) {
        list_chains();
        move_vertices();
        locate();
    }

    void run() {
        for (SurfaceField* f : task_.fields)
            f->value = f->carry == Carry::per_area ? amounts(f->value) : values(f->value);
    }

private:
    static double mean_length(const Surface& s) {
        double sum = 0;
        for (double a : s.area)
            sum += a;
        return sum / s.size();
    }

    void list_chains() {
        arc_.resize(to_.size() + 1, 0);
        chain_of_.resize(to_.size());
        longest_ = 0;
        for (int e = 0; e < static_cast<int>(to_.size()); ++e) {
            if (e == 0 || to_.chain[e] != to_.chain[e - 1]) chains_.push_back({e, e, false, 0});
            chain_of_[e] = static_cast<int>(chains_.size()) - 1;
            chains_.back().last = e + 1;
            arc_[e + 1] = arc_[e] + to_.area[e];
            longest_ = std::max(longest_, to_.area[e]);
        }
        for (Chain& c : chains_) {
            c.closed = to_.next[c.last - 1] == c.first;
            c.length = arc_[c.last] - arc_[c.first];
        }
    }

    /// Where the start and the end of each old element have moved to, so that neighbours stay
    /// joined and both keep their distance.
    void move_vertices() {
        const int size = static_cast<int>(from_.size());
        start_.resize(size);
        end_.resize(size);
        for (int e = 0; e < size; ++e) {
            const int before = from_.previous[e], after = from_.next[e];
            start_[e] = from_.vertices[from_.corners[e][0]] + displacement(before, e);
            end_[e] = from_.vertices[from_.corners[e][1]] + displacement(e, after);
        }
    }

    Vec3 displacement(int a, int b) const {
        if (a < 0 || b < 0) { // on a mirror side: along it
            const int e = a < 0 ? b : a;
            const double nz = from_.normal[e].z;
            const double rise = std::fabs(nz) > 0.3 ? -task_.moved[e] / nz : 0;
            return Vec3(0, 0, rise);
        }
        const Vec3 na = from_.normal[a], nb = from_.normal[b];
        const double ma = task_.moved[a], mb = task_.moved[b];
        const double c = na.dot(nb), determinant = 1 - c * c;
        if (determinant < 0.05 && c > 0) return (na + nb) * (-(ma + mb) / (na + nb).length2());
        if (determinant < 0.05) return (na * ma + nb * mb) * -0.5;
        return (na * (ma - c * mb) + nb * (mb - c * ma)) * (-1 / determinant);
    }

    Place place(const Vec3& p) const {
        Place best;
        double best2 = 1e300;
        for (double radius = 1.5 * mean_; best.element < 0 || best2 > radius * radius;
             radius *= 2) {
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
                    best.arc = t >= 1 ? arc_[e + 1] : arc_[e] + t * to_.area[e];
                }
            });
            if (radius > 1e9 * mean_) break;
        }
        return best;
    }
    Vec3 nearest(Vec3 d) const {
        if (task_.period_x > 0) d.x -= task_.period_x * std::round(d.x / task_.period_x);
        return d;
    }

    void locate() {
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
    void snap(Place& p, bool start, bool end = false) const {
        if (p.element < 0) return;
        const Chain& c = chains_[p.chain];
        if (c.closed) return;
        if (start && p.element == c.first) p.arc = arc_[c.first];
        if (end && p.element == c.last - 1) p.arc = arc_[c.last];
    }

    /// Signed length of the new chain that old element e covers; false if it was torn.
    bool covered(int e, double& length) const {
        const Place &a = low_[e], &b = high_[e];
        if (a.chain != b.chain) return false;
        const Chain& c = chains_[a.chain];
        length = b.arc - a.arc;
        if (c.closed) {
            if (length > 0.5 * c.length) length -= c.length;
            if (length < -0.5 * c.length) length += c.length;
        }
        return std::fabs(length) <= 3 * from_.area[e] + 4 * std::fabs(task_.moved[e]) + 4 * mean_;
    }

    std::vector<double> amounts(const std::vector<double>& old) const {
        std::vector<double> now(to_.size(), 0);
        for (int e = 0; e < static_cast<int>(old.size()); ++e) {
            double length = 0;
            if (!covered(e, length) || length == 0) {
                const int j =
                    covered(e, length)
                        ? low_[e].element
                        : place(from_.centre[e] - from_.normal[e] * task_.moved[e]).element;
                now[j] += old[e] * (from_.area[e] / to_.area[j]);
                continue;
            }
            spread(e, old[e], length > 0 ? low_[e] : high_[e], std::fabs(length), now);
        }
        return now;
    }

    /// Lays an old element's amount evenly on the stretch of new chain it covers.
    void spread(int e, double value, const Place& start, double length,
                std::vector<double>& now) const {
        const Chain& c = chains_[start.chain];
        int j = static_cast<int>(
                    std::upper_bound(arc_.begin() + c.first, arc_.begin() + c.last, start.arc) -
                    arc_.begin()) -
                1;
        double at = start.arc, rest = length;
        while (rest > 0) {
            if (at >= arc_[j + 1]) { // next element, round a loop
                if (++j >= c.last) {
                    if (!c.closed) break;
                    j = c.first;
                    at = arc_[j];
                }
                continue;
            }
            const bool ends_here = arc_[j + 1] - at >= rest;
            const double overlap = ends_here ? rest : arc_[j + 1] - at;
            now[j] += value * ((from_.area[e] / to_.area[j]) * (overlap / length));
            at = arc_[j + 1];
            rest = ends_here ? 0 : rest - overlap;
        }
        if (rest > 0)
            now[c.last - 1] += value * (from_.area[e] / to_.area[c.last - 1]) * (rest / length);
    }

    std::vector<double> values(const std::vector<double>& old) const {
        std::vector<std::vector<std::pair<double, int>>> knots(chains_.size());
        for (int e = 0; e < static_cast<int>(old.size()); ++e) {
            double length = 0;
            if (!covered(e, length)) continue;
            const Chain& c = chains_[low_[e].chain];
            double arc = length == high_[e].arc - low_[e].arc ? 0.5 * (low_[e].arc + high_[e].arc)
                                                              : low_[e].arc + 0.5 * length;
            if (c.closed && arc >= arc_[c.last]) arc -= c.length;
            if (c.closed && arc < arc_[c.first]) arc += c.length;
            knots[low_[e].chain].push_back({arc, e});
        }
        for (auto& k : knots)
            std::stable_sort(k.begin(), k.end());
        std::vector<double> now(to_.size());
        for (int j = 0; j < static_cast<int>(now.size()); ++j)
            now[j] = interpolate(knots[chain_of_[j]], chains_[chain_of_[j]],
                                 0.5 * (arc_[j] + arc_[j + 1]), to_.centre[j], old);
        return now;
    }

    double interpolate(const std::vector<std::pair<double, int>>& knots, const Chain& c, double arc,
                       const Vec3& centre, const std::vector<double>& old) const {
        if (knots.empty()) return old[nearest_old(centre)];
        const int size = static_cast<int>(knots.size());
        int after = static_cast<int>(
            std::lower_bound(knots.begin(), knots.end(), std::pair<double, int>{arc, -1}) -
            knots.begin());
        int before = after - 1;
        double low = 0, high = 0;
        if (after == size || before < 0) {
            if (!c.closed) return old[knots[after == size ? size - 1 : 0].second];
            low = knots[size - 1].first - (before < 0 ? c.length : 0);
            high = knots[0].first + (before < 0 ? 0 : c.length);
            before = size - 1;
            after = 0;
        } else {
            low = knots[before].first;
            high = knots[after].first;
        }
        const double t = high > low ? (arc - low) / (high - low) : 0;
        return (1 - t) * old[knots[before].second] + t * old[knots[after].second];
    }

    int nearest_old(const Vec3& p) const {
        int best = 0;
        double best2 = 1e300;
        for (int e = 0; e < static_cast<int>(from_.size()); ++e) {
            const double d2 =
                nearest(from_.centre[e] - from_.normal[e] * task_.moved[e] - p).length2();
            if (d2 < best2) {
                best2 = d2;
                best = e;
            }
        }
        return best;
    }

    const CarryTask& task_;
    const Surface &from_, &to_;
    double mean_, longest_ = 0;
    ElementBins bins_;
    std::vector<Chain> chains_;
    std::vector<double> arc_;
    std::vector<int> chain_of_;
    std::vector<Vec3> start_, end_;
    std::vector<Place> low_, high_;
};

} // namespace

void carry_extruded(const CarryTask& task) {
    ExtrudedCarrier(task).run();
}

} // namespace rille::geometry
