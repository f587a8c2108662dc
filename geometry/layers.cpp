// SPDX-License-Identifier: Apache-2.0
#include "geometry/layers.hpp"

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <limits>

namespace rille::geometry {

namespace {
constexpr double endless = std::numeric_limits<double>::infinity();
constexpr double just_inside =
    1e-9; ///< [cells] a point on an interface counts for the solid's side
constexpr double corner_inside = 0.2; ///< [cells] corners of the contour are known no better
constexpr double thin_share = 0.05;   ///< of the thickness of a thin film
constexpr double sliver = 0.1;        ///< [cells] what edges of full surfaces are known to
constexpr double sliver_share = 0.01; ///< of the thickness of a film: no sliver in a thin one
} // namespace

double walk(const RateTables& tables, const Layers& layers, double angle, double time,
            std::array<double, Layers::capacity>& share) {
    double left = time, distance = 0;
    for (int k = 0; k < layers.count; ++k) {
        const double rate = tables.rate(layers.row[k], angle);
        const bool last = k + 1 == layers.count || rate <= 0 || layers.thickness[k] >= rate * left;
        share[k] = last ? left / time : layers.thickness[k] / (rate * time);
        if (last) {
            std::fill(share.begin() + k + 1, share.begin() + layers.count, 0.0);
            return distance + rate * left;
        }
        distance += layers.thickness[k];
        left -= layers.thickness[k] / rate;
    }
    return distance;
}

Foot foot_of(const Vec3& p, double phi, const Vec3& nearest, const Vec3& normal, double spacing) {
    Foot foot{nearest, -normal, false};
    Vec3 line = phi < 0 ? p - nearest : nearest - p;
    const double length = line.length();
    if (length < 0.05 * spacing) return foot;
    line /= length;
    if (line.dot(foot.inward) > 1 - 1e-4) return foot;
    foot.inward = line;
    foot.corner = true;
    return foot;
}

LayerFinder::LayerFinder(const Band& band, const NormalRates& rates, const RateTables& tables,
                         const Stack& stack, const GrownFilms& films)
    : band_(band), rates_(rates), tables_(tables), stack_(stack), films_(films) {}

bool LayerFinder::near(int element, double z, double reach) const {
    for (const std::vector<double>& thickness : films_.thickness)
        if (thickness[element] > 0) return true;
    return stack_.film_at(z + reach) != stack_.film_at(z - reach);
}

/// How far inside the solid its film is read [nm]; never across a film thinner than the uncertainty
/// of corners, which would skip it.
double LayerFinder::step_inside(const Foot& foot) const {
    const double h = band_.domain.spacing;
    if (!foot.corner) return just_inside * h;
    const Film& film =
        stack_.films()[stack_.film_at(foot.point.z + just_inside * h * foot.inward.z)];
    return std::min(corner_inside * h, thin_share * (film.top - film.bottom));
}

int LayerFinder::film_inside(const Foot& foot) const {
    return stack_.film_at(foot.point.z + step_inside(foot) * foot.inward.z);
}

Foot LayerFinder::past_sliver(int element, Foot foot) const {
    if (band_.domain.planar_contour() || foot.corner) return foot;
    const int film = film_inside(foot);
    const Film& own = stack_.films()[film];
    const double depth = stack_.distance_to_interface(
        foot.point + foot.inward * just_inside * band_.domain.spacing, foot.inward);
    const double h = band_.domain.spacing;
    if (!(depth < std::min(sliver * h, sliver_share * (own.top - own.bottom)))) return foot;
    Foot beyond = foot;
    beyond.point += foot.inward * (depth + 2 * just_inside * h);
    const double angle = tilt_of(false, -foot.inward.x, -foot.inward.y, -foot.inward.z).angle;
    const int row = row_of_film(element, film), next = row_of_film(element, film_inside(beyond));
    return tables_.rate(row, angle) < 0.5 * tables_.rate(next, angle) ? beyond : foot;
}

int LayerFinder::row_below(int element, const Foot& foot) const {
    return row_of_film(element, film_inside(past_sliver(element, foot)));
}

double LayerFinder::grown(int element, Layers& out) const {
    double sum = 0;
    for (int f = static_cast<int>(films_.thickness.size()) - 1; f >= 0; --f) {
        const double thickness = films_.thickness[f][element];
        if (thickness <= 0) continue;
        out.add(rates_.row(element, films_.material[f]), thickness);
        sum += thickness;
    }
    return sum;
}

void LayerFinder::stack_below(int element, Foot foot, double reach, Layers& out) const {
    const Vec3 inward = foot.inward;
    for (double gone = 0; out.count < Layers::capacity;) {
        const int film = film_inside(foot);
        const double step = step_inside(foot);
        const int row = row_of_film(element, film);
        const double depth =
            stack_.distance_to_interface(foot.point + inward * step, inward) + step;
        gone += depth;
        const bool blocked = !tables_.moves(row);
        out.add(row, blocked || gone > reach ? endless : depth);
        if (blocked || gone > reach) return;
        foot.point += inward * depth;
        foot.corner = false;
    }
}

void LayerFinder::below(int element, const Foot& foot, double reach, Layers& out) const {
    out.count = 0;
    const double films = grown(element, out);
    if (films > reach) return;
    stack_below(element,
                past_sliver(element, {foot.point + foot.inward * films, foot.inward, foot.corner}),
                reach - films, out);
}

double LayerFinder::limit(std::size_t cell, const double* phi, double steep, int from,
                          int& after) const {
    const Band::Cell& c = band_.cells[cell];
    const double h = band_.domain.spacing, z = (c.k + 0.5) * h, slope = std::max(steep, 1.0);
    const std::vector<Film>& films = stack_.films();
    const int own = stack_.film_at(z);
    after = -1;
    if (phi[cell] < 0) {
        if (own == from) return endless;
        // The interface of film `from` that faces the cell.
        const double gap = own > from ? films[from].bottom - z : z - films[from].top;
        after = own > from ? from + 1 : from - 1;
        return std::max(0.0, (-phi[cell] - std::max(0.0, gap)) / slope);
    }
    if (own != from) return endless;
    double least = endless;
    for (int side = 4; side < 6; ++side) {
        const int n = band_.neighbour[cell][side];
        if (n < 0 || phi[n] >= 0) continue;
        const int other = stack_.film_at((band_.cells[n].k + 0.5) * h);
        if (other == own) continue;
        const double gap = other > own ? z - films[own].bottom : films[own].top - z;
        const double left = std::max(0.0, (gap - phi[cell]) / slope);
        if (left < least) {
            least = left;
            after = other > own ? own + 1 : own - 1;
        }
    }
    return least;
}

unsigned LayerFinder::slow_sides(std::size_t cell, const double* phi, int element,
                                 double angle) const {
    const double h = band_.domain.spacing;
    const int own = stack_.film_at((band_.cells[cell].k + 0.5) * h);
    unsigned sides = 0;
    for (int side = 4; side < 6; ++side) {
        const int n = band_.neighbour[cell][side];
        if (n < 0 || phi[n] >= 0) continue;
        const int other = stack_.film_at((band_.cells[n].k + 0.5) * h);
        if (other != own && tables_.rate(row_of_film(element, other), angle) <
                                0.5 * tables_.rate(row_of_film(element, own), angle))
            sides |= 1u << side;
    }
    return sides;
}

unsigned LayerFinder::unseen_sides(std::size_t cell, const double* phi, int element,
                                   const Foot& foot, double angle) const {
    const int own = stack_.film_at((band_.cells[cell].k + 0.5) * band_.domain.spacing);
    if (film_inside(past_sliver(element, foot)) != own) return 0;
    unsigned sides = slow_sides(cell, phi, element, angle);
    for (int side = 4; side < 6; ++side) {
        const int next = band_.neighbour[cell][side];
        if (next >= 0 && (slow_sides(next, phi, element, angle) >> side & 1))
            sides |= 1u << (6 + side);
    }
    return sides;
}

double LayerFinder::gap(std::size_t cell, int side) const {
    const double z = (band_.cells[cell].k + 0.5) * band_.domain.spacing;
    const Film& own = stack_.films()[stack_.film_at(z)];
    return side == 4 ? z - own.bottom : own.top - z;
}

bool LayerFinder::pinned(std::size_t cell, const double* phi, int element, double angle) const {
    const double h = band_.domain.spacing, z = (band_.cells[cell].k + 0.5) * h;
    if (phi[cell] <= 0) return false;
    const unsigned sides = slow_sides(cell, phi, element, angle);
    const Film& own = stack_.films()[stack_.film_at(z)];
    return ((sides >> 4 & 1) && phi[cell] > z - own.bottom - 0.1 * h) ||
           ((sides >> 5 & 1) && phi[cell] > own.top - z - 0.1 * h);
}

void LayerFinder::for_cell(std::size_t cell, const double* phi, double steep, int element,
                           const Foot& foot, double reach, Layers& out) const {
    out.count = 0;
    const double films = grown(element, out);
    if (films > reach) return;
    const Foot base =
        past_sliver(element, {foot.point + foot.inward * films, foot.inward, foot.corner});
    const int from = film_inside(base);
    int after = -1;
    const double bound = limit(cell, phi, steep, from, after) - films;
    const bool crosses = stack_.distance_to_interface(base.point, base.inward) <= bound;
    if (after < 0 || crosses || bound > reach) {
        stack_below(element, base, reach - films, out);
        return;
    }
    // Through the rest of the foot's film, then the films between it and the cell, each once.
    out.add(row_of_film(element, from), std::max(0.0, bound));
    const int step = after > from ? 1 : -1, count = static_cast<int>(stack_.films().size());
    double gone = std::max(0.0, bound);
    for (int film = after; film >= 0 && film < count; film += step) {
        const int row = row_of_film(element, film);
        const Film& f = stack_.films()[film];
        gone += f.top - f.bottom;
        const bool end = gone > reach || !tables_.moves(row);
        out.add(row, end ? endless : f.top - f.bottom);
        if (end) return;
    }
}

} // namespace rille::geometry
