// SPDX-License-Identifier: Apache-2.0
#include "geometry/closest_element.hpp"

#include "geometry/band_topology.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;

Vec3 nearest_on_segment(const Vec3& a, const Vec3& b, const Vec3& p) {
    const Vec3 along = b - a;
    const double square = along.dot(along);
    if (square == 0) return a;
    return a + along * std::clamp((p - a).dot(along) / square, 0.0, 1.0);
}

/// Nearest point of triangle abc: its inside where p projects into it, else its nearest edge.
Vec3 nearest_on_triangle(const Vec3& a, const Vec3& b, const Vec3& c, const Vec3& p) {
    const Vec3 n = (b - a).cross(c - a);
    const double square = n.dot(n);
    if (square > 0) {
        const Vec3 q = p - n * ((p - a).dot(n) / square);
        if ((b - a).cross(q - a).dot(n) >= 0 && (c - b).cross(q - b).dot(n) >= 0 &&
            (a - c).cross(q - c).dot(n) >= 0)
            return q;
    }
    Vec3 best = nearest_on_segment(a, b, p);
    for (const Vec3& q : {nearest_on_segment(b, c, p), nearest_on_segment(c, a, p)})
        if ((q - p).length() < (best - p).length()) best = q;
    return best;
}

/// The best element of a cell yet.
struct Candidate {
    int element = -1;
    double distance = std::numeric_limits<double>::infinity();
    Vec3 away; ///< from its nearest point to the cell
};

/// What judging an element takes, side by side in memory: elements come in no order.
struct alignas(64) Plate {
    Vec3 centre, normal; ///< [nm] where it has moved to; unit
    double size;         ///< [nm] reach from the centre: half a segment, more than a quad's disc
    double radius;       ///< [nm] of a quad's disc
};

/// From the nearest point of the disc that stands for a quad, to a point `apart` from its centre.
Vec3 from_disc(const Vec3& apart, const Plate& plate) {
    const Vec3 across = apart - plate.normal * apart.dot(plate.normal);
    const double square = across.dot(across), most = plate.radius * plate.radius;
    return square <= most ? apart - across : apart - across * std::sqrt(most / square);
}

class Search {
public:
    Search(const Band& band, const Surface& surface, const std::vector<double>& moved)
        : band_(band), surface_(surface), moved_(moved), domain_(band.domain),
          tolerance_(1e-9 * band.domain.spacing) {
        pack();
        assign_homes();
    }

    ClosestElements run();

private:
    /// What the neighbours of a cell have to say to it.
    enum class Sweep { elements_and_homes, elements, news };

    void pack();
    void assign_homes();
    Vec3 shift_of(int e) const {
        return moved_.empty() ? Vec3(0) : surface_.normal[e] * -moved_[e];
    }
    /// Nearest image of p to point c in a periodic domain.
    Vec3 image(Vec3 p, const Vec3& c) const {
        if (domain_.sides != Sides::periodic) return p;
        const auto nearest = [](double& at, double to, double width) {
            if (std::fabs(at - to) > 0.5 * width) at -= width * std::round((at - to) / width);
        };
        nearest(p.x, c.x, domain_.width_x());
        if (!domain_.extruded()) nearest(p.y, c.y, domain_.width_y());
        return p;
    }
    Vec3 from_segment(const Vec3& p, int e) const {
        const Vec3 shift = shift_of(e);
        return p - (nearest_point(surface_, true, e, p - shift) + shift);
    }
    /// Whether a quad is surely farther away than `best`, by a cheaper measure than its distance.
    bool loses(double square, const Vec3& apart, const Plate& plate, double best) const {
        if (domain_.extruded()) return false;
        const double along = apart.dot(plate.normal), across = square - along * along;
        const double beyond = std::sqrt(std::max(0.0, across)) - plate.radius;
        const double least = along * along + (beyond > 0 ? beyond * beyond : 0.0);
        const double limit = best + 2 * tolerance_;
        return least > limit * limit * (1 + 1e-9);
    }
    void offer(const Vec3& p, int e, Candidate& best) const;
    double facing(const Vec3& away, double distance, int e) const;
    bool wins_tie(const Vec3& away, double distance, int e, const Candidate& best) const;
    Candidate improved(std::size_t c, Sweep kind) const;

    const Band& band_;
    const Surface& surface_;
    const std::vector<double>& moved_;
    const Domain domain_;
    double tolerance_;
    std::vector<Plate> plates_;
    // Per cell; apart from each other because neighbours ask for the element alone.
    std::vector<int> element_;
    std::vector<double> distance_;
    std::vector<Vec3> away_;
    std::vector<char> fresh_; ///< the last sweep changed its element
    std::vector<int> home_first_, home_element_;
};

void Search::pack() {
    plates_.resize(surface_.size());
    for_ranges(plates_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t e = begin; e < end; ++e) {
            const double area = surface_.area[e];
            const double size = domain_.extruded() ? 0.5 * area : std::sqrt(area);
            plates_[e] = {surface_.centre[e] + shift_of(static_cast<int>(e)), surface_.normal[e],
                          size, size * std::sqrt(1 / pi)};
        }
    });
}

void Search::assign_homes() {
    const RowIndex index(band_);
    const double h = domain_.spacing;
    const int n = static_cast<int>(surface_.size());
    std::vector<int> home(n, -1);
    home_first_.assign(band_.size() + 1, 0);
    for_ranges(home.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t e = begin; e < end; ++e) {
            const Vec3& c = plates_[e].centre;
            const int i = static_cast<int>(std::floor((c.x - domain_.x_min()) / h));
            const int j =
                domain_.extruded() ? 0 : static_cast<int>(std::floor((c.y - domain_.y_min()) / h));
            home[e] = index.find(fold_index(i, domain_.cells_x, domain_.sides),
                                 fold_index(j, domain_.cells_y, domain_.sides),
                                 static_cast<int>(std::floor(c.z / h)));
        }
    });
    for (const int cell : home)
        if (cell >= 0) ++home_first_[cell + 1];
    for (std::size_t c = 1; c < home_first_.size(); ++c)
        home_first_[c] += home_first_[c - 1];
    std::vector<int> at(home_first_.begin(), home_first_.end() - 1);
    home_element_.resize(home_first_.back());
    for (int e = 0; e < n; ++e)
        if (home[e] >= 0) home_element_[at[home[e]]++] = e;
}

double Search::facing(const Vec3& away, double distance, int e) const {
    return distance > tolerance_ ? std::fabs(away.dot(plates_[e].normal)) / distance : 1.0;
}

bool Search::wins_tie(const Vec3& away, double distance, int e, const Candidate& best) const {
    const double mine = facing(away, distance, e);
    const double other = facing(best.away, best.distance, best.element);
    if (std::fabs(mine - other) > 1e-9) return mine > other;
    const double level =
        std::fabs(surface_.normal[e].z) - std::fabs(surface_.normal[best.element].z);
    return std::fabs(level) > 1e-9 ? level > 0 : e < best.element;
}

void Search::offer(const Vec3& p, int e, Candidate& best) const {
    if (e == best.element) return;
    const Plate& plate = plates_[e];
    const Vec3 local = image(p, plate.centre);
    const double least = best.distance + plate.size + tolerance_;
    const Vec3 apart = local - plate.centre;
    const double square = apart.dot(apart);
    if (square > least * least || loses(square, apart, plate, best.distance)) return;
    const Vec3 away = domain_.extruded() ? from_segment(local, e) : from_disc(apart, plate);
    const double distance = away.length();
    if (best.element >= 0 && !(distance < best.distance - tolerance_)) {
        if (distance > best.distance + tolerance_) return;
        if (!wins_tie(away, distance, e, best)) return;
    }
    best = {e, distance, away};
}

/// The best of what the cell and its neighbours knew. An element is looked at once.
Candidate Search::improved(std::size_t c, Sweep kind) const {
    const Band::Cell& cell = band_.cells[c];
    const Vec3 p = domain_.node(cell.i, cell.j, cell.k);
    Candidate best{element_[c], distance_[c], away_[c]};
    std::array<int, 6> seen;
    int count = 0;
    const auto homes = [&](std::size_t at) {
        if (kind == Sweep::elements_and_homes)
            for (int h = home_first_[at]; h < home_first_[at + 1]; ++h)
                offer(p, home_element_[h], best);
    };
    // Along the chain: of two elements that share the nearest vertex a neighbour may know one only.
    const auto joined = [&](int e) {
        if (e < 0 || !domain_.extruded()) return;
        for (const int n : {surface_.previous[e], surface_.next[e]})
            if (n >= 0) offer(p, n, best);
    };
    homes(c);
    joined(best.element);
    for (const int n : band_.neighbour[c]) {
        if (n < 0 || n == static_cast<int>(c) || (kind == Sweep::news && !fresh_[n])) continue;
        const int e = element_[n];
        if (e >= 0 && std::find(seen.begin(), seen.begin() + count, e) == seen.begin() + count) {
            seen[count++] = e;
            offer(p, e, best);
            joined(e);
        }
        homes(n);
    }
    return best;
}

ClosestElements Search::run() {
    const std::size_t n = band_.size();
    element_.assign(n, -1);
    distance_.assign(n, Candidate().distance);
    away_.assign(n, Vec3(0));
    fresh_.assign(n, 0);
    // Cells by distance in rings of one cell: inner rings are settled before outer ones ask them.
    std::array<std::vector<int>, 4> rings;
    for (std::vector<int>& ring : rings)
        ring.reserve(n / 2);
    const double scale = 1 / domain_.spacing;
    for (std::size_t c = 0; c < n; ++c) {
        const double ring = std::min(3.0, std::fabs(band_.phi[c]) * scale);
        rings[static_cast<std::size_t>(ring)].push_back(static_cast<int>(c));
    }
    std::vector<Candidate> next;
    for (std::size_t at = 0; at < rings.size(); ++at) {
        const std::vector<int>& ring = rings[at];
        next.resize(ring.size());
        for (int round = 0; round < (at == 0 ? 3 : 2); ++round) {
            // Homes lie within a cell of the contour; and nobody needs to hear a thing twice.
            const Sweep kind =
                round > 0 ? Sweep::news : (at < 2 ? Sweep::elements_and_homes : Sweep::elements);
            for_ranges(ring.size(), [&](std::size_t begin, std::size_t end) {
                for (std::size_t r = begin; r < end; ++r)
                    next[r] = improved(ring[r], kind);
            });
            for_ranges(ring.size(), [&](std::size_t begin, std::size_t end) {
                for (std::size_t r = begin; r < end; ++r) {
                    const int c = ring[r];
                    fresh_[c] = next[r].element != element_[c];
                    if (!fresh_[c]) continue;
                    element_[c] = next[r].element;
                    distance_[c] = next[r].distance;
                    away_[c] = next[r].away;
                }
            });
        }
    }
    for_ranges(n, [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const Band::Cell& cell = band_.cells[c];
            if (element_[c] >= 0) away_[c] = domain_.node(cell.i, cell.j, cell.k) - away_[c];
        }
    });
    return {std::move(element_), std::move(away_)};
}

} // namespace

Vec3 nearest_point(const Surface& s, bool extruded, int e, const Vec3& p) {
    if (extruded)
        return nearest_on_segment(s.vertices[s.corners[e][0]], s.vertices[s.corners[e][1]], p);
    const Vec3 from = p - s.centre[e];
    const Vec3 across = from - s.normal[e] * from.dot(s.normal[e]);
    const double square = across.dot(across), radius_square = s.area[e] * (1 / 3.14159265358979);
    if (square <= radius_square) return s.centre[e] + across;
    return s.centre[e] + across * std::sqrt(radius_square / square);
}

Vec3 exact_nearest_point(const Surface& s, bool extruded, int e, const Vec3& p) {
    if (extruded) return nearest_point(s, extruded, e, p);
    const auto& q = s.corners[e];
    const Vec3 first = nearest_on_triangle(s.vertices[q[0]], s.vertices[q[1]], s.vertices[q[2]], p);
    if (q[2] == q[3]) return first;
    const Vec3 second =
        nearest_on_triangle(s.vertices[q[0]], s.vertices[q[2]], s.vertices[q[3]], p);
    return (second - p).length() < (first - p).length() ? second : first;
}

ClosestElements closest_elements(const Band& band, const Surface& surface,
                                 const std::vector<double>& moved) {
    return Search(band, surface, moved).run();
}

} // namespace rille::geometry
