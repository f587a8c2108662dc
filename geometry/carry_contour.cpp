// SPDX-License-Identifier: Apache-2.0
#include "geometry/carry_arc_map.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

class ContourCarrier {
public:
    explicit ContourCarrier(const CarryTask& task)
        : task_(task), from_(task.from), to_(task.to), map_(task), arc_(map_.arc()) {}

    void run() {
        for (SurfaceField* f : task_.fields)
            f->value = f->carry == Carry::per_area ? amounts(f->value) : values(f->value);
    }

private:
    std::vector<double> amounts(const std::vector<double>& old) const {
        std::vector<double> now(to_.size(), 0);
        for (int e = 0; e < static_cast<int>(old.size()); ++e) {
            double length = 0;
            if (!map_.covered(e, length)) {
                const int j =
                    map_.place(from_.centre[e] - from_.normal[e] * task_.moved[e]).element;
                now[j] += old[e] * (from_.area[e] / to_.area[j]);
            } else if (length == 0) {
                const int j = facing(e, map_.low(e));
                now[j] += old[e] * (from_.area[e] / to_.area[j]);
            } else {
                const double rise = slope(e, old) * from_.length(e);
                spread(e, old[e], length > 0 ? rise : -rise,
                       length<0, length> 0 ? map_.low(e) : map_.high(e), std::fabs(length), now);
            }
        }
        return now;
    }

    /// Of the new elements that meet at a place the one that looks the way old element e does.
    int facing(int e, const Place& p) const {
        int best = p.element;
        for (const int j : {to_.previous[p.element], to_.next[p.element]}) {
            const bool touches = j >= 0 && (p.arc == arc_[p.element] ? j == to_.previous[p.element]
                                                                     : j == to_.next[p.element]);
            if (touches &&
                to_.normal[j].dot(from_.normal[e]) > to_.normal[best].dot(from_.normal[e]))
                best = j;
        }
        return best;
    }

    /// Of an amount along the arc at old element e [1/nm]: that through both neighbours, limited so
    /// that no end of an element lies outside what its neighbour holds; 0 next to corners.
    double slope(int e, const std::vector<double>& old) const {
        const int before = from_.previous[e], after = from_.next[e];
        if (before < 0 || after < 0 || ArcMap::is_corner(from_, before) ||
            ArcMap::is_corner(from_, e))
            return 0;
        const double left = old[e] - old[before], right = old[after] - old[e];
        if (left * right <= 0) return 0;
        const double size = from_.length(e);
        const double middle =
            2 * (left + right) / (from_.length(before) + 2 * size + from_.length(after));
        const double most = 2 * std::min(std::fabs(left), std::fabs(right)) / size;
        return std::copysign(std::min(std::fabs(middle), most), left);
    }

    /// Part [from, to] of [0, 1] of an old element along its arc: the share of its area there and
    /// where the middle of that area lies, seen from the middle of the whole. What sweeps about an
    /// axis has more area where it is farther out.
    struct Part {
        double share, off_middle;
    };
    Part part_of(int e, bool turned, double from, double to) const {
        const double share = to - from, middle = 0.5 * (from + to);
        if (!task_.revolved) return {share, middle - 0.5};
        double r0 = from_.vertices[from_.corners[e][0]].x;
        double r1 = from_.vertices[from_.corners[e][1]].x;
        if (turned) std::swap(r0, r1);
        if (!(r0 + r1 > 0)) return {share, middle - 0.5};
        const double scale = 2 / (r0 + r1), slope = scale * (r1 - r0), own = scale * r0;
        const double area = own + slope * middle; // per arc, 1 on average
        const double spread = share * share * slope / 12;
        return {share * area, middle + spread / area - (0.5 + slope / 12)};
    }

    /// Lays an old element's amount on the stretch of new chain it covers, `rise` more at the end
    /// than at the start; `turned`: from its end to its start.
    void spread(int e, double value, double rise, bool turned, const Place& start, double length,
                std::vector<double>& now) const {
        const ArcChain& c = map_.chains()[start.chain];
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
            const double from = 1 - rest / length;
            const Part part = part_of(e, turned, from, from + overlap / length);
            const double mean = overlap == length ? value : value + rise * part.off_middle;
            const double share = overlap == length ? 1 : part.share;
            now[j] += mean * ((from_.area[e] / to_.area[j]) * share);
            at = arc_[j + 1];
            rest = ends_here ? 0 : rest - overlap;
        }
        if (rest > 0)
            now[c.last - 1] += value * (from_.area[e] / to_.area[c.last - 1]) *
                               part_of(e, turned, 1 - rest / length, 1).share;
    }

    std::vector<double> values(const std::vector<double>& old) const {
        std::vector<std::vector<std::pair<double, int>>> knots(map_.chains().size());
        for (int e = 0; e < static_cast<int>(old.size()); ++e) {
            double length = 0;
            if (!map_.covered(e, length)) continue;
            const ArcChain& c = map_.chains()[map_.low(e).chain];
            double arc = length == map_.high(e).arc - map_.low(e).arc
                             ? 0.5 * (map_.low(e).arc + map_.high(e).arc)
                             : map_.low(e).arc + 0.5 * length;
            if (c.closed && arc >= arc_[c.last]) arc -= c.length;
            if (c.closed && arc < arc_[c.first]) arc += c.length;
            knots[map_.low(e).chain].push_back({arc, e});
        }
        for (auto& k : knots)
            std::stable_sort(k.begin(), k.end());
        std::vector<double> now(to_.size());
        for (int j = 0; j < static_cast<int>(now.size()); ++j)
            now[j] = interpolate(knots[map_.chain_of(j)], map_.chains()[map_.chain_of(j)],
                                 0.5 * (arc_[j] + arc_[j + 1]), to_.centre[j], old);
        return now;
    }

    double interpolate(const std::vector<std::pair<double, int>>& knots, const ArcChain& c,
                       double arc, const Vec3& centre, const std::vector<double>& old) const {
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
                map_.nearest(from_.centre[e] - from_.normal[e] * task_.moved[e] - p).length2();
            if (d2 < best2) {
                best2 = d2;
                best = e;
            }
        }
        return best;
    }

    const CarryTask& task_;
    const Surface &from_, &to_;
    ArcMap map_;
    const std::vector<double>& arc_;
};

} // namespace

void carry_contour(const CarryTask& task) {
    ContourCarrier(task).run();
}

} // namespace rille::geometry
