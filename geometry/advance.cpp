// SPDX-License-Identifier: Apache-2.0
#include "geometry/advance_call.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/check.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr double unresolved = 0.02;  ///< steepness off by more comes from a bend within a cell
constexpr double most_move = 0.5;    ///< [cells] of one sub-step; less than layer_reach
constexpr double smooth_share = 0.9; ///< Courant number where no edge is near: stable below 1
constexpr double most_share = 1;     ///< Courant number up to which a second stage is taken
constexpr double edge_margin = 1.4;  ///< [cells] the contour may come nearer the edge of the band

} // namespace

/// dphi/dt = R(n) |grad phi| + sum of a (slope+ - slope-) / 2: the solid (phi < 0) recedes at R.
/// Where R is the same for all normals Godunov's flux needs no dissipation. In the fan round a
/// corner phi is the distance to a point, which no difference over a cell can follow; but its slope
/// is 1.
double Advance::change(const Slopes& s, const RowPair& row, const RateWindow& window, bool fan,
                       Speed& speed) const {
    if (tables_.constant(row, window)) {
        speed.rate = tables_.rate(row, 0);
        double steep = upwind_steepness(s, speed.rate > 0, speed.waves);
        if (fan && !planar_) { // there a corner may meet a smooth face
            double waves;
            const double down = upwind_steepness(s, speed.rate <= 0, waves);
            if ((steep - 1) * (down - 1) <= 0 && std::fabs(steep - 1) > unresolved) steep = 1;
        }
        speed.waves *= std::fabs(speed.rate);
        return fan && planar_ ? speed.rate : speed.rate * steep;
    }
    return lax_friedrichs(tables_, row, window, planar_, s, speed);
}

namespace {

/// Cells whose rate depends on the normal, as many as are worked on side by side.
struct FluxCells {
    FluxLanes lanes;
    int used = 0;
    std::array<std::size_t, FluxLanes::count> cell;
    std::array<const RowPair*, FluxLanes::count> rows;
    std::array<const RateWindow*, FluxLanes::count> window;
    std::array<bool, FluxLanes::count> held;

    void add(const Band& band, const double* phi, std::size_t c, const RowPair& row,
             const RateWindow& about) {
        for (int axis = 0; axis < 3; axis += band.domain.planar_contour() ? 2 : 1) {
            const Differences d = differences_along(band, phi, c, axis, 0);
            lanes.back[axis][used] = d.back;
            lanes.ahead[axis][used] = d.ahead;
            lanes.bend[axis][used] = d.bend;
            lanes.bend_left[axis][used] = d.bend_left;
            lanes.bend_right[axis][used] = d.bend_right;
        }
        cell[used] = c;
        rows[used] = &row;
        window[used++] = &about;
    }
    void find(const RateTables& tables, bool planar, double inverse_spacing) {
        lanes.find_slopes(planar, inverse_spacing);
        tables.look_up_marks(lanes, used);
        lanes.find_tilts();
        for (int n = 0; n < used; ++n)
            held[n] = rows[n]->share == 0 && rows[n]->row == window[n]->row &&
                      tables.look_up_nodes(lanes, n, *window[n]);
        lanes.find_fluxes(planar);
    }
    bool ordinary(int n) const { return held[n] && lanes.ordinary[n] != 0; }
    Slopes slopes(int n) const {
        Slopes s;
        for (int axis = 0; axis < 3; ++axis) {
            s.minus[axis] = lanes.minus[axis][n];
            s.plus[axis] = lanes.plus[axis][n];
        }
        return s;
    }
};

} // namespace

/// Calls take(cell, dphi/dt, speed) for the cells of a range that move, but for layered ones.
template <class Take>
void Advance::sweep(const double* phi, std::size_t begin, std::size_t end, const Take& take) const {
    FluxCells cells;
    const auto finish = [&] {
        cells.find(tables_, planar_, 1 / h_);
        for (int n = 0; n < cells.used; ++n) {
            Speed speed{cells.lanes.waves[n], cells.lanes.smooth[n] != 0, cells.lanes.rate[n]};
            double change = cells.lanes.change[n];
            if (!cells.ordinary(n))
                change = lax_friedrichs(tables_, *cells.rows[n], *cells.window[n], planar_,
                                        cells.slopes(n), speed);
            take(cells.cell[n], change, speed);
        }
        cells.used = 0;
    };
    for (std::size_t c = begin; c < end; ++c) {
        const RowPair& row = row_[c];
        if (row.row < 0) continue;
        const RateWindow& window = element_window_[element_[c]];
        if (!tables_.moves(row, window)) continue;
        if (tables_.constant(row, window)) {
            Speed speed;
            const Slopes s = slopes(phi, c, 0, false);
            const double rate = change(s, row, window, fan_[c], speed);
            speed.smooth = smooth(s);
            take(c, rate, speed);
            continue;
        }
        cells.add(band_, phi, c, row, window);
        if (cells.used == FluxLanes::count) finish();
    }
    if (cells.used > 0) finish();
}

/// The same at the mean rate over `dt` through layers: each acts for its share of the time.
double Advance::layered_change(const Slopes& s, const Layers& layers, bool fan, double dt,
                               double& waves) const {
    std::array<double, Layers::capacity> share;
    const double angle = tilt_of(planar_, s.mean(0), s.mean(1), s.mean(2)).angle;
    walk(tables_, layers, angle, dt, share);
    double sum = 0;
    waves = 0;
    for (int k = 0; k < layers.count; ++k) {
        Speed speed;
        if (share[k] <= 0 || layers.row[k].row < 0) continue; // NaN stays
        const double part = change(s, layers.row[k], {}, fan, speed);
        speed.smooth = false; // a film may end within the cell
        sum += share[k] * part;
        waves = std::max(waves, counted(part, speed));
    }
    return sum;
}

/// Slopes of the front that the cell belongs to. Where a front meets a resting wall at an inner
/// edge, the gas beyond the bisector is nearer to the wall; its phi would hold the front back, so
/// the front's own plane stands in for it. So it does behind an interface that the front runs along
/// if the rate depends on the normal: a vertical wall must not be seen tilted by what is below it.
Slopes Advance::special_slopes(const double* phi, const LayeredCell& at) const {
    Slopes s =
        slopes(phi, at.cell, (at.directional ? at.unseen & direct_sides : at.unseen) | at.beside,
               at.directional);
    for (int side = 4; side < 6 && !at.directional; ++side)
        if (at.unseen >> side & 1)
            mirror_slopes(band_, phi, at.cell, 1 / h_, side, finder_.gap(at.cell, side),
                          Limiter::isotropic, s);
    const unsigned plane = at.beside | (at.directional ? at.unseen : 0u);
    for (int side = 0; side < 6; ++side) {
        if (!(plane >> side & 1)) continue;
        (side & 1 ? s.plus : s.minus)[side / 2] = (&surface_.normal[element_[at.cell]].x)[side / 2];
    }
    return s;
}

/// Calls body(l) for each layered cell: they are few, and each takes long.
template <class Body>
void Advance::over_layered(const Body& body) {
    over_ranges(layered_.size(), 128, [&](std::size_t begin, std::size_t end) {
        for (std::size_t l = begin; l < end; ++l)
            body(l);
    });
}

/// What the speed of waves of a cell counts for the length of a sub-step: less where phi is smooth,
/// since twice the share will do there. Largest values pass over NaN, so a change that is not
/// finite, of a rate that is not, counts as infinitely fast.
double Advance::counted(double change, const Speed& speed) const {
    if (!std::isfinite(change)) return std::numeric_limits<double>::infinity();
    if (!speed.smooth) return speed.waves;
    return limits_.max_share / std::min(2 * limits_.max_share, smooth_share) * speed.waves;
}

Speed Advance::first_stage() {
    Speed most;
    const double* phi = band_.phi.data();
    std::vector<double> front(band_.size() / 1024 + 2, 0.0);
    most.waves = largest_of_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        double waves = 0, fastest = 0;
        std::fill(slope_.begin() + begin, slope_.begin() + end, 0.0);
        sweep(phi, begin, end, [&](std::size_t c, double change, const Speed& speed) {
            slope_[c] = change;
            waves = std::max(waves, counted(change, speed));
            if (std::fabs(phi[c]) < h_) fastest = std::max(fastest, std::fabs(speed.rate));
        });
        front[begin / 1024] = fastest;
        return waves;
    });
    most.rate = *std::max_element(front.begin(), front.end());
    std::vector<Speed> layered(layered_.size());
    over_layered([&](std::size_t l) { layered[l] = find_layers(layered_[l]); });
    for (const Speed& speed : layered) {
        most.waves = std::max(most.waves, speed.waves);
        most.rate = std::max(most.rate, speed.rate);
    }
    return most;
}

double Advance::choose_step(const Speed& most) const {
    double dt = limits_.time - report_.time;
    if (most.waves > 0) dt = std::min(dt, limits_.max_share * h_ / most.waves);
    if (most.rate > 0)
        dt = std::min(dt, std::min(most_move, limits_.max_move - report_.largest_move) * h_ /
                              most.rate);
    return dt;
}

/// Mean dphi/dt of both stages in place of that of the first; the largest speed of waves in the
/// second. Where the rate turns steeply with the normal it may be many times that of the first, and
/// dissipation at that speed would throw phi about.
double Advance::second_stage(double dt) {
    over_layered([&](std::size_t l) {
        const std::size_t c = layered_[l].cell;
        double waves;
        slope_[c] = layered_change(special_slopes(band_.phi.data(), layered_[l]),
                                   layered_[l].layers, fan_[c], dt, waves);
    });
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c)
            next_[c] = band_.phi[c] + dt * slope_[c];
    });
    const double* next = next_.data();
    double most = largest_of_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        double waves = 0;
        sweep(next, begin, end, [&](std::size_t c, double second, const Speed& speed) {
            slope_[c] = 0.5 * (slope_[c] + second);
            waves = std::max(waves, counted(second, speed));
        });
        return waves;
    });
    std::vector<double> layered(layered_.size());
    over_layered([&](std::size_t l) {
        const LayeredCell& at = layered_[l];
        const double second =
            layered_change(special_slopes(next, at), at.layers, fan_[at.cell], dt, layered[l]);
        slope_[at.cell] = 0.5 * (slope_[at.cell] + second);
    });
    for (const double waves : layered)
        most = std::max(most, waves);
    return most;
}

/// By the mean of both stages.
void Advance::step(double dt) {
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c)
            band_.phi[c] += dt * slope_[c];
    });
    for (const LayeredCell& at : layered_) {
        const double time = report_.time + dt - time_of_refresh_;
        band_.phi[at.cell] = std::min(band_.phi[at.cell], at.wall + at.wall_rate * time);
    }
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
        if (thickness <= 0) continue;
        const double rate = tables_.rate(layers.row[k], angle);
        const bool gone = k + 1 < layers.count && share[k + 1] > 0;
        if (rate > 0) thickness = gone ? 0.0 : std::max(0.0, thickness - rate * share[k] * dt);
        ++k;
    }
    for (int l = 0; l < layers.count; ++l)
        grown += std::max(0.0, -tables_.rate(layers.row[l], angle)) * share[l] * dt;
    if (grown == 0) return;
    RILLE_CHECK(growth_film_[e] >= 0, "growth on an element without a film to grow");
    films_.thickness[growth_film_[e]][e] += grown;
}

AdvanceReport Advance::run() {
    if (band_.size() > 0) refresh();
    while (report_.time < limits_.time && report_.largest_move < limits_.max_move * (1 - 1e-9)) {
        if (moved_since_refresh_ > refresh_move) refresh();
        const Speed most = first_stage();
        if (!std::isfinite(most.waves)) throw NumericsError("a rate at the front is not finite");
        double dt = choose_step(most);
        for (double waves; (waves = second_stage(dt)) * dt > most_share * h_;) {
            if (!std::isfinite(waves)) throw NumericsError("a rate at the front is not finite");
            first_stage(); // finds the slopes again that second_stage has overwritten
            dt = limits_.max_share * h_ / waves;
        }
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
    const int top = band.cells.back().k + 1;
    const double depth = largest_of_ranges(band.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) // cells are sorted by height
            if (band.phi[c] < 0)
                for (const int n : band.neighbour[c])
                    if (n >= 0 && band.phi[n] >= 0) return double(top - band.cells[c].k);
        return 0.0;
    });
    return depth > 0 ? (top - depth + 0.5) * band.domain.spacing
                     : std::numeric_limits<double>::infinity();
}

AdvanceReport advance(Front& front, const Surface& surface, const NormalRates& rates,
                      const Stack& stack, GrownFilms& films, const std::vector<int>& growth_film,
                      double z_floor, const AdvanceLimits& limits) {
    RILLE_CHECK(rates.first_row.size() == surface.size() + 1, "rates of another surface");
    RILLE_CHECK(limits.max_share > 0 && limits.max_share <= 1 && limits.max_move > 0, "limits");
    const double h = front.domain().spacing;
    AdvanceReport report = Advance(front, surface, rates, stack, films, growth_film, limits).run();
    // Contouring in three dimensions needs the diagonal neighbours of the front as well.
    if (edge_distance(front.band()) < (band_half_width - edge_margin) * h ||
        contour_lacks_cells(front.band()))
        front.rebuild();
    if (lowest_contour(front.band()) < z_floor + 2 * h)
        throw NumericsError("the front comes within two cells of the lower end of the domain");
    return report;
}

} // namespace rille::geometry
