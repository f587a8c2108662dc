// SPDX-License-Identifier: Apache-2.0
#include "geometry/front.hpp"

#include "geometry/band.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/between_centres.hpp"
#include "geometry/check.hpp"
#include "geometry/closest_element.hpp"
#include "geometry/hamiltonian.hpp"
#include "geometry/layers.hpp"
#include "geometry/redistance.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr int layered_row = -2;       ///< marks cells whose row depends on where the front is
constexpr double layer_reach = 0.6;   ///< [cells] more than any sub-step moves
constexpr double refresh_move = 0.75; ///< [cells] nearest elements and band hold for this far
constexpr double resting_share =
    0.5; ///< a wall rests if slower than this share of the front beside it
constexpr double edge_margin = 1.4; ///< [cells] the contour may come nearer the edge of the band

/// A cell near an interface or a grown film, or beside a wall that rests: where its foot was when
/// phi was phi0.
struct LayeredCell {
    int cell = 0;
    Foot foot;
    double phi0 = 0;
    unsigned resting = 0; ///< sides (bits) whose neighbour belongs to a wall that rests
    unsigned unseen = 0;  ///< sides behind an interface that the front runs along
    unsigned beside = 0;  ///< sides whose neighbour is nearer to a resting wall than to this front
    double wall = std::numeric_limits<double>::infinity(); ///< [nm] bound of phi at a resting wall
    double wall_rate = 0;
    bool directional = false; ///< the rate below the foot depends on the normal
    Layers layers;
    BetweenCentres place;
};

struct Speed {
    double waves = 0; ///< sum of |dH/dp| along the axes [nm/s]
    double rate = 0;  ///< of the front along its normal [nm/s]
};

/// One call of `advance`.
class Advance {
public:
    Advance(Front& front, const Surface& surface, const NormalRates& rates, const Stack& stack,
            GrownFilms& films, const std::vector<int>& growth_film, const AdvanceLimits& limits)
        : front_(front), band_(front.band()), surface_(surface), rates_(rates), tables_(rates), films_(films),
          growth_film_(growth_film), limits_(limits), finder_(band_, rates, tables_, stack, films),
          extruded_(band_.domain.extruded()), h_(band_.domain.spacing) {
        report_.moved.assign(surface.size(), 0.0);
    }

    AdvanceReport run();

private:
    void refresh();
    void classify_cells(const ClosestElements&);
    void classify_elements();
    BetweenCentres place_of(std::size_t c, const ClosestElements&) const;
    unsigned resting_sides(std::size_t c) const;
    void find_wall(LayeredCell&) const;
    Slopes special_slopes(const double* phi, const LayeredCell&) const;
    Slopes slopes(const double* phi, std::size_t c, unsigned unseen = 0) const {
        return extruded_ ? slopes_2d(band_, phi, c, 1 / h_, unseen)
                         : slopes_3d(band_, phi, c, 1 / h_, unseen);
    }
    double change(const Slopes&, const RowPair&, Speed&) const;
    void blend(RowPair&, const BetweenCentres&) const;
    double layered_change(const Slopes&, const Layers&, double dt) const;
    Speed first_stage();
    void find_layers(LayeredCell&, Speed&);
    double choose_step(const Speed&) const;
    void step(double dt);
    void move_elements(double dt);
    void take_from_films(int e, double dt);

    Front& front_;
    Band& band_;
    const Surface& surface_;
    const NormalRates& rates_;
    RateTables tables_;
    GrownFilms& films_;
    const std::vector<int>& growth_film_;
    const AdvanceLimits& limits_;
    LayerFinder finder_;
    bool extruded_;
    double h_;
    AdvanceReport report_;
    double moved_since_refresh_ = 0; ///< [cells]
    double time_of_refresh_ = 0;     ///< [s]
    std::vector<int> element_;
    std::vector<RowPair> row_;
    std::vector<double> slope_, next_; ///< dphi/dt at the first stage; phi after it
    std::vector<LayeredCell> layered_;
    std::vector<int> layered_elements_;
    std::vector<Tilt> element_tilt_;
    std::vector<double> element_rate_, own_rate_; ///< own: before films are peeled
};

/// Nearest elements, redistancing and rows for the present band; `surface` displaced by `moved`.
void Advance::refresh() {
    const bool first = report_.sub_steps == 0;
    if (!first)
        front_.rebuild();
    const ClosestElements closest =
        closest_elements(band_, surface_, first ? std::vector<double>() : report_.moved);
    if (first)
        report_.redistance_shift = redistance(band_, surface_, closest);
    // Nothing of the front is left near such cells: they drop out of the band.
    for (std::size_t c = 0; c < band_.size(); ++c)
        if (closest.element[c] < 0)
            band_.phi[c] = std::copysign(4 * h_, band_.phi[c]);
    classify_elements();
    classify_cells(closest);
    slope_.assign(band_.size(), 0.0);
    next_ = band_.phi;
    moved_since_refresh_ = 0;
    time_of_refresh_ = report_.time;
}

void Advance::classify_cells(const ClosestElements& closest) {
    const double reach = (refresh_move + 2 * layer_reach + 0.5) * h_;
    element_ = closest.element;
    row_.assign(band_.size(), {});
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const int e = element_[c];
            if (e < 0)
                continue;
            const Band::Cell& cell = band_.cells[c];
            const double z = (cell.k + 0.5) * h_, z_foot = closest.foot[c].z;
            const double middle = 0.5 * (z + z_foot), spread = 0.5 * std::fabs(z - z_foot);
            if (finder_.near(e, middle, reach + spread) || resting_sides(c))
                row_[c].row = layered_row;
            else
                row_[c].row = finder_.row_below(e, {closest.foot[c], -surface_.normal[e], false});
            blend(row_[c], place_of(c, closest));
        }
    });
    layered_.clear();
    for (std::size_t c = 0; c < band_.size(); ++c)
        if (row_[c].row == layered_row) {
            layered_.emplace_back();
            layered_.back().cell = static_cast<int>(c);
            const Band::Cell& cell = band_.cells[c];
            layered_.back().foot = foot_of(band_.domain.node(cell.i, cell.j, cell.k), band_.phi[c],
                                           closest.foot[c], surface_.normal[element_[c]], h_);
            layered_.back().phi0 = band_.phi[c];
            layered_.back().resting = resting_sides(c);
            layered_.back().place = place_of(c, closest);
            find_wall(layered_.back());
        }
}

/// Where on the surface, as it was when the rates were found, the foot of a cell lies.
BetweenCentres Advance::place_of(std::size_t c, const ClosestElements& closest) const {
    return between_centres(band_.domain, surface_, closest.element[c], closest.foot[c]);
}

/// Takes in the row that the neighbour has for the same material.
void Advance::blend(RowPair& rows, const BetweenCentres& place) const {
    if (rows.row < 0 || place.partner < 0)
        return;
    rows.other = rates_.row(place.partner, rates_.material[rows.row]);
    rows.share = rows.other < 0 ? 0 : place.share;
}

/// Sides where the front of cell c meets one that turns by more than 45 degrees and rests, or
/// nearly.
unsigned Advance::resting_sides(std::size_t c) const {
    const int e = element_[c];
    const double rate = own_rate_[e];
    if (rate <= 0)
        return 0;
    unsigned sides = 0;
    for (int side = 0; side < 6; ++side) {
        const int n = band_.neighbour[c][side], other = n < 0 ? -1 : element_[n];
        if (other < 0 || other == e || std::fabs(own_rate_[other]) > resting_share * rate)
            continue;
        if (surface_.normal[e].dot(surface_.normal[other]) < 0.7)
            sides |= 1u << side;
    }
    return sides;
}

/// A front that runs down along a resting wall leaves the wall behind it: at an inner edge the
/// distance to the surface is at most the distance to the wall's plane, on either side of it.
void Advance::find_wall(LayeredCell& at) const {
    const std::size_t c = at.cell;
    const int e = element_[c];
    const Band::Cell& cell = band_.cells[c];
    const Vec3 p = band_.domain.node(cell.i, cell.j, cell.k);
    const auto apart = [this](Vec3 d) {
        if (band_.domain.sides == Sides::periodic) {
            const double wx = band_.domain.width_x(), wy = band_.domain.width_y();
            d.x -= wx * std::round(d.x / wx);
            if (!extruded_)
                d.y -= wy * std::round(d.y / wy);
        }
        return d;
    };
    for (int side = 0; side < 6; ++side) {
        if (!(at.resting >> side & 1))
            continue;
        const int w = element_[band_.neighbour[c][side]];
        const Vec3& n = surface_.normal[w];
        const Vec3 wall = surface_.centre[w] - n * report_.moved[w];
        const Vec3 front = surface_.centre[e] - surface_.normal[e] * report_.moved[e];
        if (apart(wall - front).dot(surface_.normal[e]) <= 0)
            continue;
        const double distance = apart(p - wall).dot(n);
        if (distance >= at.wall)
            continue;
        at.wall = distance;
        // What the front lays bare of the wall recedes as the front's film does at that normal.
        const int row = finder_.row_below(e, at.foot);
        at.wall_rate = std::max(own_rate_[w], tables_.rate(row, element_tilt_[w].angle));
    }
    at.wall = std::max(at.wall, at.phi0);
}

void Advance::classify_elements() {
    const double reach = (refresh_move + 2 * layer_reach) * h_;
    element_tilt_.resize(surface_.size());
    element_rate_.assign(surface_.size(), 0.0);
    layered_elements_.clear();
    for (std::size_t e = 0; e < surface_.size(); ++e) {
        const Vec3& n = surface_.normal[e];
        const Vec3 p = surface_.centre[e] - n * report_.moved[e];
        const int id = static_cast<int>(e);
        element_tilt_[e] = tilt_of(extruded_, n.x, n.y, n.z);
        const int row = finder_.row_below(id, {p, -n, false});
        element_rate_[e] = tables_.rate(row, element_tilt_[e].angle);
        // Growth starts a film, so such elements are layered too.
        if (element_rate_[e] < 0 || finder_.near(id, p.z, reach))
            layered_elements_.push_back(id);
    }
    own_rate_ = element_rate_;
    for (const int e : layered_elements_)
        element_rate_[e] = 0;
}

/// dphi/dt = R(n) |grad phi| + sum of a (slope+ - slope-) / 2: the solid (phi < 0) recedes at R.
/// Where R is the same for all normals Godunov's flux needs no dissipation.
double Advance::change(const Slopes& s, const RowPair& row, Speed& speed) const {
    if (tables_.constant(row)) {
        speed.rate = tables_.rate(row, 0);
        const double steep = upwind_steepness(s, speed.rate > 0, speed.waves);
        speed.waves *= std::fabs(speed.rate);
        return speed.rate * steep;
    }
    const double gx = s.mean(0), gy = s.mean(1), gz = s.mean(2);
    const Tilt mean = tilt_of(extruded_, gx, gy, gz);
    speed.rate = tables_.rate(row, mean.angle);
    const std::array<double, 3> a = dissipation(tables_, row, extruded_, s, mean);
    speed.waves = a[0] + a[1] + a[2];
    double sum = speed.rate * std::sqrt(gx * gx + gy * gy + gz * gz);
    for (int axis = 0; axis < 3; ++axis)
        sum += 0.5 * a[axis] * (s.plus[axis] - s.minus[axis]);
    return sum;
}

/// The same at the mean rate over `dt` through layers: each acts for its share of the time.
double Advance::layered_change(const Slopes& s, const Layers& layers, double dt) const {
    std::array<double, Layers::capacity> share;
    const double angle = tilt_of(extruded_, s.mean(0), s.mean(1), s.mean(2)).angle;
    walk(tables_, layers, angle, dt, share);
    double sum = 0;
    for (int k = 0; k < layers.count; ++k) {
        Speed speed;
        if (share[k] > 0 && layers.row[k].row >= 0)
            sum += share[k] * change(s, layers.row[k], speed);
    }
    return sum;
}

/// Slopes of the front that the cell belongs to. Where a front meets a resting wall at an inner
/// edge, the gas beyond the bisector is nearer to the wall; its phi would hold the front back, so
/// the front's own plane stands in for it. So it does behind an interface that the front runs along
/// if the rate depends on the normal: a vertical wall must not be seen tilted by what is below it.
Slopes Advance::special_slopes(const double* phi, const LayeredCell& at) const {
    Slopes s = slopes(phi, at.cell, at.unseen | at.beside);
    const unsigned plane = at.beside | (at.directional ? at.unseen : 0u);
    for (int side = 0; side < 6; ++side) {
        if (!(plane >> side & 1))
            continue;
        (side & 1 ? s.plus : s.minus)[side / 2] = (&surface_.normal[element_[at.cell]].x)[side / 2];
    }
    return s;
}

Speed Advance::first_stage() {
    Speed most;
    const double* phi = band_.phi.data();
    std::vector<double> front(band_.size() / 1024 + 2, 0.0);
    most.waves = largest_of_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        double waves = 0, fastest = 0;
        for (std::size_t c = begin; c < end; ++c) {
            const RowPair& row = row_[c];
            slope_[c] = 0;
            if (!tables_.moves(row))
                continue;
            Speed speed;
            slope_[c] = change(slopes(phi, c), row, speed);
            waves = std::max(waves, speed.waves);
            if (std::fabs(phi[c]) < h_)
                fastest = std::max(fastest, std::fabs(speed.rate));
        }
        front[begin / 1024] = fastest;
        return waves;
    });
    most.rate = *std::max_element(front.begin(), front.end());
    for (LayeredCell& cell : layered_)
        find_layers(cell, most);
    return most;
}

void Advance::find_layers(LayeredCell& at, Speed& most) {
    const std::size_t c = at.cell;
    const int e = element_[c];
    const double* phi = band_.phi.data();
    Slopes s = slopes(phi, c);
    const auto length = [&] {
        return std::sqrt(s.mean(0) * s.mean(0) + s.mean(1) * s.mean(1) + s.mean(2) * s.mean(2));
    };
    Foot foot = at.foot;
    foot.point += foot.inward * ((phi[c] - at.phi0) / std::max(length(), 0.5));
    at.unseen = finder_.unseen_sides(c, phi, e, foot, element_tilt_[e].angle);
    at.directional = !tables_.constant(finder_.row_below(e, foot));
    at.beside = 0;
    for (int side = 0; side < 6; ++side) {
        const int next = band_.neighbour[c][side];
        if (next < 0 || (at.unseen >> side & 1))
            continue;
        if (!(at.resting >> side & 1) && !finder_.pinned(next, phi, e, element_tilt_[e].angle))
            continue;
        const double n = (&surface_.normal[e].x)[side / 2] * (side & 1 ? h_ : -h_);
        const double there = phi[next];
        if (there > 0 && there < phi[c] + n - 0.05 * h_)
            at.beside |= 1u << side;
    }
    s = special_slopes(phi, at);
    finder_.for_cell(c, phi, length(), e, foot, layer_reach * h_, at.layers);
    for (int k = 0; k < at.layers.count; ++k) {
        Speed speed;
        blend(at.layers.row[k], at.place);
        if (at.layers.row[k].row >= 0)
            change(s, at.layers.row[k], speed);
        most.waves = std::max(most.waves, speed.waves);
        if (std::fabs(phi[c]) < h_)
            most.rate = std::max(most.rate, std::fabs(speed.rate));
    }
}

double Advance::choose_step(const Speed& most) const {
    double dt = limits_.time - report_.time;
    if (most.waves > 0)
        dt = std::min(dt, limits_.max_share * h_ / most.waves);
    if (most.rate > 0)
        dt = std::min(dt, (limits_.max_move - report_.largest_move) * h_ / most.rate);
    return dt;
}

void Advance::step(double dt) {
    for_ranges(layered_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t l = begin; l < end; ++l) {
            const std::size_t c = layered_[l].cell;
            slope_[c] = layered_change(special_slopes(band_.phi.data(), layered_[l]),
                                       layered_[l].layers, dt);
        }
    });
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c)
            next_[c] = band_.phi[c] + dt * slope_[c];
    });
    const double* next = next_.data();
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const RowPair& row = row_[c];
            if (!tables_.moves(row))
                continue;
            Speed speed;
            const double second = change(slopes(next, c), row, speed);
            band_.phi[c] += 0.5 * dt * (slope_[c] + second);
        }
    });
    for_ranges(layered_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t l = begin; l < end; ++l) {
            const std::size_t c = layered_[l].cell;
            const LayeredCell& at = layered_[l];
            const double second = layered_change(special_slopes(next, at), at.layers, dt);
            const double time = report_.time + dt - time_of_refresh_;
            band_.phi[c] = std::min(band_.phi[c] + 0.5 * dt * (slope_[c] + second),
                                    at.wall + at.wall_rate * time);
        }
    });
    move_elements(dt);
}

void Advance::move_elements(double dt) {
    for (std::size_t e = 0; e < surface_.size(); ++e)
        report_.moved[e] += element_rate_[e] * dt;
    for (const int e : layered_elements_)
        take_from_films(e, dt);
}

void Advance::take_from_films(int e, double dt) {
    const Vec3& n = surface_.normal[e];
    Layers layers;
    finder_.below(e, {surface_.centre[e] - n * report_.moved[e], -n, false}, layer_reach * h_,
                  layers);
    std::array<double, Layers::capacity> share;
    const double angle = element_tilt_[e].angle;
    report_.moved[e] += walk(tables_, layers, angle, dt, share);
    int k = 0;
    double grown = 0;
    for (int f = static_cast<int>(films_.thickness.size()) - 1; f >= 0 && k < layers.count; --f) {
        double& thickness = films_.thickness[f][e];
        if (thickness <= 0)
            continue;
        const double rate = tables_.rate(layers.row[k], angle);
        const bool gone = k + 1 < layers.count && share[k + 1] > 0;
        if (rate > 0)
            thickness = gone ? 0.0 : std::max(0.0, thickness - rate * share[k] * dt);
        ++k;
    }
    for (int l = 0; l < layers.count; ++l)
        grown += std::max(0.0, -tables_.rate(layers.row[l], angle)) * share[l] * dt;
    if (grown == 0)
        return;
    RILLE_CHECK(growth_film_[e] >= 0, "growth on an element without a film to grow");
    films_.thickness[growth_film_[e]][e] += grown;
}

AdvanceReport Advance::run() {
    if (band_.size() > 0)
        refresh();
    while (report_.time < limits_.time && report_.largest_move < limits_.max_move * (1 - 1e-9)) {
        if (moved_since_refresh_ > refresh_move)
            refresh();
        const Speed most = first_stage();
        if (!std::isfinite(most.waves))
            throw NumericsError("a rate at the front is not finite");
        const double dt = choose_step(most);
        const bool last = dt >= limits_.time - report_.time;
        step(dt);
        ++report_.sub_steps;
        report_.time = last ? limits_.time : report_.time + dt;
        report_.largest_move += most.rate * dt / h_;
        moved_since_refresh_ += most.rate * dt / h_;
    }
    return report_;
}

/// Lowest solid node next to the gas [nm].
double lowest_contour(const Band& band) {
    double lowest = std::numeric_limits<double>::infinity();
    for (std::size_t c = 0; c < band.size(); ++c) {
        if (band.phi[c] >= 0)
            continue;
        for (const int n : band.neighbour[c])
            if (n >= 0 && band.phi[n] >= 0)
                lowest = std::min(lowest, (band.cells[c].k + 0.5) * band.domain.spacing);
    }
    return lowest;
}

} // namespace

AdvanceReport advance(Front& front, const Surface& surface, const NormalRates& rates,
                      const Stack& stack, GrownFilms& films, const std::vector<int>& growth_film,
                      double z_floor, const AdvanceLimits& limits) {
    RILLE_CHECK(rates.first_row.size() == surface.size() + 1, "rates of another surface");
    RILLE_CHECK(limits.max_share > 0 && limits.max_share <= 1 && limits.max_move > 0, "limits");
    const double h = front.domain().spacing;
    AdvanceReport report = Advance(front, surface, rates, stack, films, growth_film, limits).run();
    // Contouring in three dimensions needs the diagonal neighbours of the front as well.
    if (!front.domain().extruded() ||
        edge_distance(front.band()) < (band_half_width - edge_margin) * h)
        front.rebuild();
    if (lowest_contour(front.band()) < z_floor + 2 * h)
        throw NumericsError("the front comes within two cells of the lower end of the domain");
    return report;
}

} // namespace rille::geometry
