// SPDX-License-Identifier: Apache-2.0
#include "fluxes/arc_average.hpp"

#include "fluxes/surroundings.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

using geometry::Domain;
using geometry::Surface;
using geometry::Vec3;

constexpr double window_cells = 5;

/// Elements in walking order without a corner between them.
struct Piece {
    std::vector<int> elements;
    bool ring = false; ///< the last joins the first
    /// Begins, ends at a mirror side, and goes on there as its image without a corner.
    bool from_mirror = false, to_mirror = false;
};

bool corner_between(const Surface& s, int e, int f, double angle = corner_angle) {
    return s.normal[e].dot(s.normal[f]) < std::cos(angle);
}

/// Whether an element that ends at a mirror side meets its image in a corner.
bool corner_at_side(const Surface& s, int e, double angle) {
    const Vec3& n = s.normal[e];
    return n.dot(mirrored(n, along_x)) < std::cos(angle);
}

/// Pieces of the contour without a corner of more than `angle` [rad].
std::vector<Piece> smooth_pieces(const Domain& domain, const Surface& s, double angle) {
    const bool mirrors = domain.sides == geometry::Sides::mirror;
    const int count = static_cast<int>(s.size());
    std::vector<char> taken(count, 0);
    std::vector<Piece> pieces;
    for (int seed = 0; seed < count; ++seed) {
        if (taken[seed]) continue;
        int start = seed;
        bool ring = false;
        for (int e = s.previous[start]; e >= 0 && !corner_between(s, e, start, angle);
             e = s.previous[e]) {
            start = e;
            if (e == seed) {
                ring = true;
                break;
            }
        }
        Piece piece;
        piece.ring = ring;
        for (int e = start; e >= 0 && !taken[e]; e = s.next[e]) {
            if (e != start && corner_between(s, s.previous[e], e, angle)) break;
            taken[e] = 1;
            piece.elements.push_back(e);
        }
        const int first = piece.elements.front(), last = piece.elements.back();
        piece.from_mirror = mirrors && s.previous[first] < 0 && !corner_at_side(s, first, angle);
        piece.to_mirror = mirrors && s.next[last] < 0 && !corner_at_side(s, last, angle);
        pieces.push_back(std::move(piece));
    }
    return pieces;
}

/// Second integral over arc of the indicator of [from, to].
double twice_integrated(double s, double from, double to) {
    if (s <= from) return 0.0;
    if (s <= to) return 0.5 * (s - from) * (s - from);
    return (to - from) * (s - 0.5 * (from + to));
}

/// Mean over [a, b] of the box average of width `window` of the indicator of [from, to].
double box_weight(double a, double b, double window, double from, double to) {
    const double half = 0.5 * window;
    const auto d = [&](double s) { return twice_integrated(s, from, to); };
    return std::max(0.0,
                    (d(b + half) - d(a + half) - d(b - half) + d(a - half)) / (window * (b - a)));
}

void add_piece(const Surface& surface, const Piece& piece, double window,
               std::vector<std::vector<ArcAverage::Part>>& rows) {
    const int n = static_cast<int>(piece.elements.size());
    std::vector<double> s(n + 1, 0.0);
    for (int i = 0; i < n; ++i)
        s[i + 1] = s[i] + surface.length(piece.elements[i]);
    const double all = s[n];
    const bool halved = piece.from_mirror || piece.to_mirror; // the rest is its image
    if ((halved ? 2 : 1) * all <= window || (n == 1 && !halved)) {
        // Shorter than the window: one average.
        for (int e : piece.elements)
            for (int f : piece.elements)
                for (const std::uint8_t image : {std::uint8_t(0), along_x})
                    if (halved || !image)
                        rows[e].push_back({f, image, surface.length(f) / all / (halved ? 2 : 1)});
        return;
    }
    const auto of_image = [&](int i, int j, bool of_mirror) {
        double w = 0;
        if (!piece.ring && piece.from_mirror == of_mirror)
            w += box_weight(s[i], s[i + 1], window, -s[j + 1], -s[j]);
        if (!piece.ring && piece.to_mirror == of_mirror)
            w += box_weight(s[i], s[i + 1], window, 2 * all - s[j + 1], 2 * all - s[j]);
        return w;
    };
    const auto weight = [&](int i, int j) {
        double w = 0;
        for (int k = -1; k <= 1; ++k)
            if (piece.ring || k == 0)
                w += box_weight(s[i], s[i + 1], window, s[j] + k * all, s[j + 1] + k * all);
        return w + of_image(i, j, false);
    };
    const auto reaches = [&](int i, int j) {
        return std::min(std::fabs(s[i + 1] - s[j]), std::fabs(s[j + 1] - s[i])) < 0.6 * window;
    };
    for (int i = 0; i < n; ++i) {
        int low = i, high = i;
        while (low > 0 && reaches(i, low - 1))
            --low;
        while (high + 1 < n && reaches(i, high + 1))
            ++high;
        std::vector<int> near;
        for (int j = low; j <= high; ++j)
            near.push_back(j);
        if (piece.ring) {
            for (int j = 0; j < low && s[j] < window; ++j)
                near.push_back(j);
            for (int j = n - 1; j > high && all - s[j + 1] < window; --j)
                near.push_back(j);
        }
        double sum = 0;
        auto& row = rows[piece.elements[i]];
        for (int j : near) {
            for (const std::uint8_t image : {std::uint8_t(0), along_x}) {
                const double w = image ? of_image(i, j, true) : weight(i, j);
                if (w <= 0) continue;
                row.push_back({piece.elements[j], image, w});
                sum += w;
            }
        }
        for (auto& part : row)
            part.weight /= sum;
    }
}

/// How much of an average is left between places whose normals differ by an angle of this cosine:
/// all up to 15 degrees, nothing from 45 on, smoothly in between.
double left_over(double cosine) {
    const double from = std::cos(0.5 * corner_angle), to = std::cos(1.5 * corner_angle);
    const double x = std::clamp((cosine - to) / (from - to), 0.0, 1.0);
    return x * x * (3 - 2 * x);
}

/// Weakens weights by how far the surface turns on the way between two elements. A limit to the
/// angle would let averages jump where a bend that moves along comes and goes as a corner, and with
/// them the rates on either side.
void fade_with_turn(const Surface& surface, std::vector<std::vector<ArcAverage::Part>>& rows) {
    using Way = std::vector<int>;
    const auto least_of = [&](double least, const Vec3& a, const Vec3& b, int k) {
        return std::min(
            {least, left_over(a.dot(surface.normal[k])), left_over(b.dot(surface.normal[k]))});
    };
    const auto left_on_way = [&](int e, int f, const Way& next) {
        double least = 1;
        for (int k = e; least > 0; k = next[k]) {
            if (k < 0) return 0.0;
            least = least_of(least, surface.normal[e], surface.normal[f], k);
            if (k == f) break;
        }
        return least;
    };
    /// To the end of the chain and on in the image.
    const auto left_to_image = [&](int e, int f, const Way& next) {
        const Vec3 own = surface.normal[e], other = surface.normal[f];
        double least = 1;
        for (int k = e; k >= 0 && least > 0; k = next[k])
            least = least_of(least, own, mirrored(other, along_x), k);
        for (int k = f; k >= 0 && least > 0; k = next[k])
            least = least_of(least, mirrored(own, along_x), other, k);
        return least;
    };
    for (std::size_t e = 0; e < rows.size(); ++e)
        for (ArcAverage::Part& part : rows[e]) {
            const int own = static_cast<int>(e), other = part.element;
            part.weight *= part.image ? std::max(left_to_image(own, other, surface.previous),
                                                 left_to_image(own, other, surface.next))
                                      : left_on_way(own, other,
                                                    other >= own ? surface.next : surface.previous);
        }
}

/// Turns weights that keep sums of value times length into ones that keep sums of value times area.
/// Times the lengths they are the same both ways; K_ef = L_e w_ef r_e r_f stays so, and x_e K_ef
/// x_f with sums over f equal to the areas does both: the scaling of a symmetric matrix to given
/// row sums (Sinkhorn and Knopp 1967, from memory). Near the axis, where areas change fast, this
/// still reaches as far as elsewhere.
void weigh_by_area(const Surface& surface, std::vector<std::vector<ArcAverage::Part>>& rows) {
    fade_with_turn(surface, rows);
    constexpr int rounds = 60;
    const std::size_t count = surface.size();
    std::vector<double> scale(count, 1.0), next(count);
    for (std::size_t e = 0; e < count; ++e)
        for (ArcAverage::Part& part : rows[e])
            part.weight *=
                surface.area[e] * surface.area[part.element] / surface.length(part.element);
    const auto sum_of = [&](std::size_t e) {
        double sum = 0;
        for (const ArcAverage::Part& part : rows[e])
            sum += part.weight * scale[part.element];
        return sum;
    };
    for (int round = 0; round < rounds; ++round) {
        for (std::size_t e = 0; e < count; ++e) {
            const double sum = sum_of(e);
            next[e] = sum > 0 ? std::sqrt(scale[e] * surface.area[e] / sum) : scale[e];
        }
        scale.swap(next);
    }
    for (std::size_t e = 0; e < count; ++e) {
        double rest = 1; // what the rounds have left, to the element itself
        for (ArcAverage::Part& part : rows[e]) {
            part.weight *= scale[e] * scale[part.element] / surface.area[e];
            rest -= part.weight;
        }
        for (ArcAverage::Part& part : rows[e])
            if (part.element == static_cast<int>(e) && !part.image) part.weight += rest;
    }
}

} // namespace

ArcAverage arc_average(const Domain& domain, const Surface& surface) {
    if (!domain.planar_contour()) return average_over_surroundings(domain, surface);
    std::vector<std::vector<ArcAverage::Part>> rows(surface.size());
    const double angle = domain.revolved() ? 1.5 * corner_angle : corner_angle;
    for (const Piece& piece : smooth_pieces(domain, surface, angle))
        add_piece(surface, piece, window_cells * domain.spacing, rows);
    if (domain.revolved()) weigh_by_area(surface, rows);
    ArcAverage average;
    average.first.push_back(0);
    for (const auto& row : rows) {
        average.parts.insert(average.parts.end(), row.begin(), row.end());
        average.first.push_back(static_cast<int>(average.parts.size()));
    }
    return average;
}

std::vector<geometry::Vec3> averaged_normals(const Surface& surface, const ArcAverage& average) {
    std::vector<geometry::Vec3> normals(surface.size());
    for (std::size_t e = 0; e < surface.size(); ++e) {
        geometry::Vec3 sum(0, 0, 0);
        for (int i = average.first[e]; i < average.first[e + 1]; ++i) {
            const ArcAverage::Part& part = average.parts[i];
            sum += mirrored(surface.normal[part.element], part.image) * part.weight;
        }
        const double length = sum.length();
        normals[e] = length > 1e-12 ? sum / length : surface.normal[e];
    }
    return normals;
}

} // namespace rille::fluxes
