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
    double square = std::numeric_limits<double>::infinity(); ///< of its distance [nm^2]
};

/// From the centre of an element, or its nearest image in a periodic domain, to p.
Vec3 from_centre(const Domain& domain, const Vec3& p, const Plate& plate) {
    Vec3 apart = p - plate.centre;
    if (domain.sides != Sides::periodic) return apart;
    const auto shorten = [](double& d, double width) {
        if (std::fabs(d) > 0.5 * width) d -= width * std::round(d / width);
    };
    shorten(apart.x, domain.width_x());
    if (!domain.planar_contour()) shorten(apart.y, domain.width_y());
    return apart;
}

/// From the nearest point of an element to a point `apart` from its centre.
Vec3 from_nearest(const Vec3& apart, const Plate& plate) {
    const Vec3 across = apart - plate.normal * apart.dot(plate.normal);
    const double square = across.dot(across), most = plate.radius * plate.radius;
    return square <= most ? apart - across : apart - across * std::sqrt(most / square);
}

/// The square of its length, found with less.
double square_to_nearest(const Vec3& apart, const Plate& plate) {
    const double along = apart.dot(plate.normal), square = along * along;
    const double across = std::sqrt(std::max(0.0, apart.dot(apart) - square));
    const double beyond = std::max(0.0, across - plate.radius);
    return square + beyond * beyond;
}

/// Cells learn of elements from each other, in rings about the contour: from settled inner rings
/// first, then from their own.
class Search {
public:
    Search(const Band& band, const Surface& surface, const std::vector<double>& moved)
        : band_(band), surface_(surface), domain_(band.domain),
          tie_(2e-9 * band.domain.spacing * band.domain.spacing) {
        pack(moved);
        assign_homes();
        sort_into_rings();
    }

    ClosestElements run();

private:
    static constexpr char no_news = -1;
    static constexpr int rings = 4;            ///< a cell wide; the last one has no end
    static constexpr int rings_with_homes = 2; ///< homes lie within a cell of the contour

    void pack(const std::vector<double>& moved);
    void assign_homes();
    void sort_into_rings();
    Vec3 node(int c) const {
        const Band::Cell& cell = band_.cells[c];
        return domain_.node(cell.i, cell.j, cell.k);
    }
    void offer(const Vec3& p, int e, Candidate& best) const;
    void offer_joined(const Vec3& p, int e, Candidate& best) const;
    void offer_homes(const Vec3& p, int cell, Candidate& best) const;
    double facing(const Vec3& p, int e) const;
    bool wins_tie(const Vec3& p, int e, int other) const;
    void ask_inner_rings(int ring);
    void ask_own_ring(int ring);

    const Band& band_;
    const Surface& surface_;
    const Domain domain_;
    double tie_; ///< squares of distances that differ by no more [nm^2]
    RawVector<Plate> plates_;
    // Per cell; apart from each other because neighbours ask for the element alone.
    RawVector<int> element_;
    RawVector<double> square_;
    RawVector<char> ring_, news_; ///< news: of the ring where a cell has just changed its element
    RawVector<int> ring_cells_;   ///< cells by ring
    std::array<std::size_t, rings + 1> ring_first_;
    /// Elements by the cell that holds their centre: the first of each cell, the next of each.
    RawVector<int> home_first_, home_next_;
};

void Search::pack(const std::vector<double>& moved) {
    plates_.resize(surface_.size());
    for_ranges(plates_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t e = begin; e < end; ++e) {
            const Vec3& n = surface_.normal[e];
            plates_[e] = {moved.empty() ? surface_.centre[e] : surface_.centre[e] - n * moved[e], n,
                          domain_.planar_contour() ? 0.5 * surface_.length(static_cast<int>(e))
                                                   : std::sqrt(surface_.area[e] * (1 / pi))};
        }
    });
}

void Search::assign_homes() {
    const RowIndex index(band_);
    const double scale = 1 / domain_.spacing;
    RawVector<int> home(surface_.size());
    for_ranges(home.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t e = begin; e < end; ++e) {
            const Vec3& c = plates_[e].centre;
            const int i = static_cast<int>(std::floor((c.x - domain_.x_min()) * scale));
            const int j = domain_.planar_contour()
                              ? 0
                              : static_cast<int>(std::floor((c.y - domain_.y_min()) * scale));
            home[e] = index.find(fold_index(i, domain_.cells_x, domain_.sides),
                                 fold_index(j, domain_.cells_y, domain_.sides),
                                 static_cast<int>(std::floor(c.z * scale)));
        }
    });
    home_first_.resize(band_.size());
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        std::fill(home_first_.begin() + begin, home_first_.begin() + end, -1);
    });
    home_next_.resize(home.size());
    for (int e = static_cast<int>(home.size()) - 1; e >= 0; --e)
        if (home[e] >= 0) home_next_[e] = std::exchange(home_first_[home[e]], e);
}

void Search::sort_into_rings() {
    const std::size_t n = band_.size();
    const double scale = 1 / domain_.spacing;
    ring_.resize(n);
    element_.resize(n);
    news_.resize(n);
    square_.resize(n);
    std::vector<std::array<std::size_t, rings>> first(range_of(n) + 1);
    for_ranges(n, [&](std::size_t begin, std::size_t end) {
        auto& count = first[range_of(begin)];
        count.fill(0);
        for (std::size_t c = begin; c < end; ++c) {
            element_[c] = -1;
            news_[c] = no_news;
            ring_[c] = static_cast<char>(std::min(rings - 1.0, std::fabs(band_.phi[c]) * scale));
            ++count[ring_[c]];
        }
    });
    std::size_t sum = 0;
    for (int ring = 0; ring < rings; ++ring) {
        ring_first_[ring] = sum;
        for (auto& range : first)
            sum += std::exchange(range[ring], sum);
    }
    ring_first_[rings] = sum;
    ring_cells_.resize(n);
    for_ranges(n, [&](std::size_t begin, std::size_t end) {
        auto at = first[range_of(begin)];
        for (std::size_t c = begin; c < end; ++c)
            ring_cells_[at[ring_[c]]++] = static_cast<int>(c);
    });
}

double Search::facing(const Vec3& p, int e) const {
    const Vec3 from = from_nearest(from_centre(domain_, p, plates_[e]), plates_[e]);
    const double square = from.dot(from);
    return square > tie_ * tie_ ? std::fabs(from.dot(plates_[e].normal)) / std::sqrt(square) : 1.0;
}

bool Search::wins_tie(const Vec3& p, int e, int other) const {
    const double more = facing(p, e) - facing(p, other);
    if (std::fabs(more) > 1e-9) return more > 0;
    const double level = std::fabs(surface_.normal[e].z) - std::fabs(surface_.normal[other].z);
    return std::fabs(level) > 1e-9 ? level > 0 : e < other;
}

/// Takes the nearer one without a branch, for which of two it is nobody can guess.
void Search::offer(const Vec3& p, int e, Candidate& best) const {
    const Plate& plate = plates_[e];
    const double square = square_to_nearest(from_centre(domain_, p, plate), plate);
    double lead = best.square - square;
    if ((std::fabs(lead) <= tie_) & (e != best.element))
        lead = wins_tie(p, e, best.element) ? 1 : -1;
    best = {lead > 0 ? e : best.element, lead > 0 ? square : best.square};
}

/// An element with those beside it on its chain: of two that share the nearest vertex a neighbour
/// may know one only.
void Search::offer_joined(const Vec3& p, int e, Candidate& best) const {
    offer(p, e, best);
    if (!domain_.planar_contour()) return;
    for (const int n : {surface_.previous[e], surface_.next[e]})
        if (n >= 0) offer(p, n, best);
}

void Search::offer_homes(const Vec3& p, int cell, Candidate& best) const {
    for (int e = home_first_[cell]; e >= 0; e = home_next_[e])
        offer_joined(p, e, best);
}

void Search::ask_inner_rings(int ring) {
    for_ranges(ring_first_[ring + 1] - ring_first_[ring], [&](std::size_t begin, std::size_t end) {
        for (std::size_t r = begin; r < end; ++r) {
            const int c = ring_cells_[ring_first_[ring] + r];
            const Vec3 p = node(c);
            Candidate best;
            for (const int n : band_.neighbour[c])
                if (n >= 0 && ring_[n] < ring && element_[n] >= 0)
                    offer_joined(p, element_[n], best);
            if (ring < rings_with_homes) {
                offer_homes(p, c, best);
                for (const int n : band_.neighbour[c])
                    if (n >= 0) offer_homes(p, n, best);
            }
            element_[c] = best.element;
            square_[c] = best.square;
            news_[c] = best.element >= 0 ? ring_[c] : no_news;
        }
    });
}

/// Nobody needs to hear a thing twice: only what has changed since the last round counts.
void Search::ask_own_ring(int ring) {
    RawVector<Candidate> next(ring_first_[ring + 1] - ring_first_[ring]);
    for_ranges(next.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t r = begin; r < end; ++r) {
            const int c = ring_cells_[ring_first_[ring] + r];
            const Vec3 p = node(c);
            next[r] = {element_[c], square_[c]};
            for (const int n : band_.neighbour[c])
                if (n >= 0 && news_[n] == ring) offer_joined(p, element_[n], next[r]);
        }
    });
    for_ranges(next.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t r = begin; r < end; ++r) {
            const int c = ring_cells_[ring_first_[ring] + r];
            news_[c] = next[r].element != element_[c] ? ring_[c] : no_news;
            element_[c] = next[r].element;
            square_[c] = next[r].square;
        }
    });
}

ClosestElements Search::run() {
    for (int ring = 0; ring < rings; ++ring) {
        ask_inner_rings(ring);
        for (int round = 0; round < (ring == 0 ? 2 : 1); ++round)
            ask_own_ring(ring);
    }
    return {std::move(plates_), std::move(element_)};
}

} // namespace

Vec3 nearest_point(const Surface& s, bool planar, int e, const Vec3& p) {
    if (planar)
        return nearest_on_segment(s.vertices[s.corners[e][0]], s.vertices[s.corners[e][1]], p);
    const Vec3 from = p - s.centre[e];
    const Vec3 across = from - s.normal[e] * from.dot(s.normal[e]);
    const double square = across.dot(across), radius_square = s.area[e] * (1 / 3.14159265358979);
    if (square <= radius_square) return s.centre[e] + across;
    return s.centre[e] + across * std::sqrt(radius_square / square);
}

Vec3 exact_nearest_point(const Surface& s, bool planar, int e, const Vec3& p) {
    if (planar) return nearest_point(s, planar, e, p);
    const auto& q = s.corners[e];
    const Vec3 first = nearest_on_triangle(s.vertices[q[0]], s.vertices[q[1]], s.vertices[q[2]], p);
    if (q[2] == q[3]) return first;
    const Vec3 second =
        nearest_on_triangle(s.vertices[q[0]], s.vertices[q[2]], s.vertices[q[3]], p);
    return (second - p).length() < (first - p).length() ? second : first;
}

Vec3 nearest_point(const Domain& domain, const Plate& plate, const Vec3& p) {
    return p - from_nearest(from_centre(domain, p, plate), plate);
}

ClosestElements closest_elements(const Band& band, const Surface& surface,
                                 const std::vector<double>& moved) {
    return Search(band, surface, moved).run();
}

} // namespace rille::geometry
