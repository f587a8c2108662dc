// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ring_factors.hpp"

#include "geometry/check.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <numeric>

namespace rille::fluxes {
namespace {

double apart(const PlanePoint& a, const PlanePoint& b) {
    return std::hypot(b.x - a.x, b.z - a.z);
}

bool is_straight(double string, const PlanePoint& a, const PlanePoint& b) {
    return string <= apart(a, b) * (1 + 1e-6) + 1e-12;
}

PlanePoint normal_of(const PlanePoint& a, const PlanePoint& b) {
    const double length = apart(a, b);
    return {-(b.z - a.z) / length, (b.x - a.x) / length};
}

} // namespace

bool RoundProfile::serves(const geometry::Domain& domain, const geometry::Surface& surface) {
    if (!domain.revolved()) return false;
    std::map<int, double> turn; // of chains off the open one: clockwise about solid
    double top = -HUGE_VAL;
    int last = -1;
    for (int e = 0; e < static_cast<int>(surface.size()); ++e) {
        const auto &a = surface.vertices[surface.corners[e][0]],
                   &b = surface.vertices[surface.corners[e][1]];
        if (surface.chain[e] != 0) {
            turn[surface.chain[e]] += a.x * b.z - a.z * b.x;
            continue;
        }
        top = std::max({top, a.z, b.z});
        if (surface.next[e] < 0) last = e;
    }
    for (const auto& [chain, area] : turn)
        if (area < 0) return false;
    bool out = false;
    for (int e = last; e >= 0; e = surface.previous[e]) {
        if (surface.vertices[surface.corners[e][1]].z < top - 0.05 * domain.spacing) break;
        out = true;
    }
    return out;
}

RoundProfile::RoundProfile(const geometry::Domain& domain, const geometry::Surface& surface) {
    int first = -1;
    for (int e = 0; e < static_cast<int>(surface.size()) && first < 0; ++e)
        if (surface.chain[e] == 0 && surface.previous[e] < 0) first = e;
    RILLE_CHECK(first >= 0, "no part of the surface is open to the source");
    for (int e = first; e >= 0; e = surface.next[e]) {
        const auto &a = surface.vertices[surface.corners[e][0]],
                   &b = surface.vertices[surface.corners[e][1]];
        if (point_.empty()) point_.push_back({a.x, a.z});
        point_.push_back({b.x, b.z});
        order_.push_back(e);
        area_.push_back(surface.area[e]);
    }
    tolerance_ = 0.02 * domain.spacing;
    for (const PlanePoint& p : point_)
        top_ = p.z > top_ || &p == &point_[0] ? p.z : top_;
    // The flat outside of the hole, as seen from the side of the cell.
    rim_ = static_cast<int>(point_.size()) - 1;
    while (rim_ > 0 && point_[rim_ - 1].z >= top_ - 0.05 * domain.spacing)
        --rim_;
    // From its lowest vertex on, does the profile only rise, and does it only fall before?
    for (int k = 0; k <= rim_; ++k)
        if (point_[k].z < point_[bottom_].z - tolerance_) bottom_ = k;
    bore_ = rising_ = true;
    for (int k = 1; k <= rim_; ++k) {
        const double step = point_[k].z - point_[k - 1].z;
        bore_ = bore_ && (k <= bottom_ ? step <= tolerance_ : step >= -tolerance_);
    }
    rising_ = bore_ && bottom_ == 0;
    to_rim_ = strings_to(rim_);
    every_.resize(point_.size());
    std::iota(every_.begin(), every_.end(), 1);
}

/// Of each vertex from the lowest one on, the next of a string pulled taut from there to `vertex`
/// along the wall, the wall on its outer side. A line's distance from the axis is convex over its
/// height: where it leaves the vertices of that string to the outside, it leaves all others.
std::vector<int> RoundProfile::strings_to(int vertex) const {
    std::vector<int> next(point_.size(), -1);
    for (int k = vertex - 1; k >= bottom_; --k) {
        const PlanePoint& from = point_[k];
        next[k] = k + 1;
        for (int t = k + 1; t < vertex; t = next[t]) {
            const PlanePoint &p = point_[t], &to = point_[next[t]];
            if (!(from.z < p.z && p.z < to.z)) break;
            if (p.x < from.x + (p.z - from.z) / (to.z - from.z) * (to.x - from.x)) break;
            next[k] = next[t];
        }
    }
    return next;
}

BetweenRings RoundProfile::what_stands_between() const {
    BetweenRings between;
    between.point = &point_;
    between.last_edge = static_cast<std::size_t>(bore_ ? bottom_ : rim_);
    between.next = &every_;
    if (bore_) between.first_bore = bottom_, between.last_bore = rim_;
    return between;
}

/// Whether no edge that faces away from the axis, solid within, reaches into these heights.
bool RoundProfile::is_clear(double low, double high) const {
    if (rising_) return true;
    for (std::size_t k = 0; k + 1 < point_.size(); ++k) {
        const PlanePoint &a = point_[k], &b = point_[k + 1];
        if (b.z < a.z && a.z > low + tolerance_ && b.z < high - tolerance_) return false;
    }
    return true;
}

/// Whether the disc from the axis to this vertex lies in the gas.
bool RoundProfile::is_open_disc(int vertex) const {
    if (rising_) return true;
    const double z = point_[vertex].z + tolerance_;
    for (int k = 0; k + 1 < static_cast<int>(point_.size()); ++k) {
        const PlanePoint &a = point_[k], &b = point_[k + 1];
        if (k == vertex || k + 1 == vertex || (a.z > z) == (b.z > z)) continue;
        if (a.x + (z - a.z) / (b.z - a.z) * (b.x - a.x) < point_[vertex].x) return false;
    }
    return true;
}

RingPoint RoundProfile::on_chord(int first, int last, double part) const {
    const PlanePoint &a = point_[first], &b = point_[last];
    return {{a.x + part * (b.x - a.x), a.z + part * (b.z - a.z)}, normal_of(a, b)};
}

/// Direct flux where nothing stands before the disc spanned by the rim.
double RoundProfile::by_discs(int place) const {
    const PlanePoint &a = point_[place], &b = point_[place + 1], &rim = point_[rim_];
    return std::max(0.0, disc_exchange(b.x, rim.x, rim.z - b.z) -
                             disc_exchange(a.x, rim.x, rim.z - a.z)) /
           area_[place];
}

/// Factor from a point to the sky of a profile that only rises: in each vertical plane through the
/// point the sky is one interval, between the near and the far side of the circles that the
/// vertices above sweep.
double RoundProfile::by_horizons(const RingPoint& from, int place) const {
    constexpr double half_turn = 3.14159265358979323846;
    const double r = from.at.x;
    double narrowest = point_[rim_].x;
    for (int k = place + 1; k < rim_; k = to_rim_[k])
        if (point_[k].z > from.at.z) narrowest = std::min(narrowest, point_[k].x);
    // Azimuths from the outward radius: planes that miss the narrowest circle see nothing.
    const double first = narrowest < r ? half_turn - std::asin(narrowest / r) : 0.0;
    double sum = 0;
    for (int g = 0; g < 32; ++g) {
        const double part = 0.5 * (gauss_16().node[g % 16] + g / 16);
        const double azimuth = first + (half_turn - first) * part;
        const double cosine = std::cos(azimuth), sine = std::sin(azimuth);
        double low = 0, high = HUGE_VAL; // tangents of the angle from the vertical
        for (int k = place + 1; k >= 0; k = to_rim_[k]) {
            const double rise = point_[k].z - from.at.z;
            const double root2 = point_[k].x * point_[k].x - r * r * sine * sine;
            if (!(rise > 0)) continue;
            if (!(root2 > 0)) {
                high = -1;
                break;
            }
            const double root = std::sqrt(root2);
            low = std::max(low, (-r * cosine - root) / rise);
            high = std::min(high, (-r * cosine + root) / rise);
        }
        // normal . direction > 0
        const double level = from.normal.x * cosine, up = from.normal.z;
        if (level < 0)
            high = std::min(high, up / -level);
        else if (up < 0)
            low = level > 0 ? std::max(low, -up / level) : HUGE_VAL;
        if (!(low < high)) continue;
        const auto integral = [&](double tangent) {
            const double secant2 = 1 + tangent * tangent;
            return 0.5 / secant2 * tangent * (up * tangent - level) +
                   0.5 * level * std::atan(tangent);
        };
        sum += 0.5 * gauss_16().weight[g % 16] * (integral(high) - integral(low));
    }
    return sum * 2 * (half_turn - first) / half_turn;
}

/// The same for any profile, over the disc that the rim spans.
double RoundProfile::by_windows(const RingPoint& from, int place) const {
    const PlanePoint rim = point_[rim_];
    std::vector<CosineRange> scratch;
    BetweenRings between = what_stands_between();
    between.own[0] = {std::size_t(place), std::size_t(place + 1)};
    if (bore_ && place + 1 >= bottom_) {
        between.next = &to_rim_;
        between.first_bore = place + 1;
    }
    double sum = 0;
    for (int g = 0; g < 48; ++g) {
        const double s = (gauss_16().node[g % 16] + g / 16) / 3;
        const RingPoint to{{rim.x * s, rim.z}, {0, -1}};
        sum += gauss_16().weight[g % 16] / 3 * s * ring_kernel(from, to, between, scratch);
    }
    return sum * 2 * 3.14159265358979323846 * rim.x * rim.x;
}

/// What lies below the rim sees the sky through the disc that the rim spans.
double RoundProfile::sky(int place) const {
    if (place >= rim_) return 1.0;
    const PlanePoint rim = point_[rim_];
    double flux = 0, weight = 0;
    for (int i = 0; i < 3; ++i) {
        const RingPoint from = on_chord(place, place + 1, gauss_3().node[i]);
        const double rise = rim.z - from.at.z, r = from.at.x;
        const double w = gauss_3().weight[i] * r; // by area
        weight += w;
        // Nothing stands between where no vertex crosses the line to the rim, nor lies within.
        bool clear = is_clear(from.at.z, rim.z);
        for (int k = place + 1; k < rim_ && clear; ++k) {
            const double t = (point_[k].z - from.at.z) / rise;
            const double line = r + t * (rim.x - r);
            clear = !(t > 0 && t < 1) || point_[k].x >= line - 1e-3 * tolerance_;
        }
        const double tilt = std::max(from.normal.x * (r - rim.x), from.normal.x * (r + rim.x));
        if (clear && from.normal.z * rise >= tilt - 1e-9 * r)
            flux += w * factor_to_disc(from, rim.x, rise);
        else if (clear && is_open_disc(place) && is_open_disc(place + 1))
            return by_discs(place);
        else
            flux += w * (rising_ ? by_horizons(from, place) : by_windows(from, place));
    }
    return weight > 0 ? std::clamp(flux / weight, 0.0, 1.0) : 1.0;
}

/// Exchange of two patches, as straight frusta, over the azimuths that nothing hides. Where they
/// lie close to each other they are halved. next: strings_to the lower end of the higher one.
double RoundProfile::by_azimuths(const Patches& patches, int i, int j,
                                 const std::vector<int>& next) const {
    const auto corner = [&](int p) {
        return p < int(patches.size()) ? patches.first(p) : int(order_.size());
    };
    const Chord from{point_[corner(i)], point_[corner(i + 1)]};
    const Chord to{point_[corner(j)], point_[corner(j + 1)]};
    Between between{what_stands_between(), {}};
    const int low = std::min(i, j), high = std::max(i, j);
    for (const int side : {0, 1}) {
        const int p = side == 0 ? i : j;
        between.rings.own[side] = {std::size_t(corner(p)), std::size_t(corner(p + 1))};
    }
    if (bore_ && corner(high) > bottom_) {
        between.rings.next = &next;
        between.rings.first_bore = std::max(corner(low + 1), bottom_);
        between.rings.last_bore = corner(high);
    }
    const double both = from.measure() * to.measure();
    return both > 0 ? integrate(from, to, 0, between) / both * patches.area(i) * patches.area(j)
                    : 0.0;
}

/// Integral of the kernel over radius and length of both.
double RoundProfile::integrate(const Chord& from, const Chord& to, int halvings,
                               Between& between) const {
    constexpr int most_halvings = 12;
    const double l1 = apart(from.start, from.end), l2 = apart(to.start, to.end);
    const double near = std::min({apart(from.start, to.start), apart(from.start, to.end),
                                  apart(from.end, to.start), apart(from.end, to.end)});
    if (halvings < most_halvings && near < 0.5 * std::max(l1, l2)) {
        const bool first = l1 >= l2;
        const Chord& longer = first ? from : to;
        const PlanePoint middle = longer.at(0.5);
        const Chord parts[] = {{longer.start, middle}, {middle, longer.end}};
        double sum = 0;
        for (const Chord& part : parts)
            sum += first ? integrate(part, to, halvings + 1, between)
                         : integrate(from, part, halvings + 1, between);
        return sum;
    }
    double sum = 0;
    const PlanePoint n1 = normal_of(from.start, from.end), n2 = normal_of(to.start, to.end);
    for (int m = 0; m < 3; ++m) {
        const RingPoint p{from.at(gauss_3().node[m]), n1};
        for (int n = 0; n < 3; ++n) {
            const RingPoint q{to.at(gauss_3().node[n]), n2};
            sum += gauss_3().weight[m] * gauss_3().weight[n] * p.at.x * q.at.x *
                   ring_kernel(p, q, between.rings, between.scratch);
        }
    }
    return sum * l1 * l2;
}

std::vector<double> RoundProfile::factors(const Patches& patches) const {
    const int n = static_cast<int>(patches.size()), columns = static_cast<int>(order_.size());
    std::vector<PlanePoint> polygon = point_;
    const double roof = top_ + point_.back().x;
    polygon.push_back({point_.back().x, roof});
    polygon.push_back({0, roof});
    const TautStrings strings(std::move(polygon));
    std::vector<int> end(n + 1);
    for (int p = 0; p <= n; ++p)
        end[p] = p < n ? patches.first(p) : columns;
    std::vector<char> straight(std::size_t(n + 1) * (n + 1)), open(n + 1);
    tbb::parallel_for(0, n + 1, [&](int i) {
        const auto length = strings.lengths(end[i]);
        open[i] = is_open_disc(end[i]);
        for (int j = 0; j <= n; ++j)
            straight[i * (n + 1) + j] = is_straight(length[end[j]], point_[end[i]], point_[end[j]]);
    });
    const auto sees = [&](int i, int j) { return straight[i * (n + 1) + j] != 0; };
    std::vector<double> exchange(std::size_t(n) * columns, 0.0);
    const auto spread = [&](int i, int j, double all) { // over the elements of j
        for (int k = end[j]; k < end[j + 1]; ++k)
            exchange[std::size_t(i) * columns + k] = all * area_[k] / patches.area(j);
    };
    const auto by_discs = [&](int i, int j) {
        const PlanePoint &a = point_[end[i]], &b = point_[end[i + 1]];
        for (int k = end[j]; k < end[j + 1]; ++k) {
            const PlanePoint &c = point_[k], &d = point_[k + 1];
            const auto discs = [](const PlanePoint& p, const PlanePoint& q) {
                return disc_exchange(p.x, q.x, q.z - p.z);
            };
            exchange[std::size_t(i) * columns + k] = (discs(a, d) - discs(a, c)) +
                                                     (discs(b, c) - discs(b, d)) +
                                                     (i == j ? area_[k] : 0.0);
        }
    };
    tbb::parallel_for(0, n, [&](int i) { // row i up to the diagonal, and its mirror image
        const std::vector<int> next = strings_to(end[i]);
        for (int j = 0; j <= i; ++j) {
            if (end[i] >= rim_) continue; // the flat outside sees sky alone
            const auto height = [&](int v) { return point_[end[v]].z; };
            const double low = std::min({height(i), height(i + 1), height(j), height(j + 1)});
            const double high = std::max({height(i), height(i + 1), height(j), height(j + 1)});
            if (open[i] && open[i + 1] && open[j] && open[j + 1] && sees(i, j) && sees(i, j + 1) &&
                sees(i + 1, j) && sees(i + 1, j + 1) && is_clear(low, high)) {
                by_discs(i, j);
                if (i != j) by_discs(j, i);
            } else {
                const double all = by_azimuths(patches, i, j, next);
                spread(i, j, all);
                if (i != j) spread(j, i, all);
            }
        }
    });
    return exchange;
}

} // namespace rille::fluxes
