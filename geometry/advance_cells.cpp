// SPDX-License-Identifier: Apache-2.0
// What each cell of the band moves by: nearest element, rows of rates, films and walls about it.
#include "geometry/advance_call.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/check.hpp"
#include "geometry/redistance.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {
constexpr double even_share = 1.02; ///< a neighbour's rate may be larger by as much
constexpr double cell_reach = 4;    ///< [cells] few cells are farther than that from their element
} // namespace

/// Nearest elements, redistancing and rows for the present band; `surface` displaced by `moved`.
void Advance::refresh() {
    const bool first = report_.sub_steps == 0;
    if (!first) front_.rebuild();
    ClosestElements closest =
        closest_elements(band_, surface_, first ? std::vector<double>() : report_.moved);
    if (first) report_.redistance_shift = redistance(band_, surface_, closest);
    plates_ = std::move(closest.plates);
    element_ = std::move(closest.element);
    // Cells that still say near where nothing of the front is left drop out of the band. (Cells
    // farther out may have no element in reach, beyond a sharp corner: they keep their value.)
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c)
            if (element_[c] < 0 && std::fabs(band_.phi[c]) < 1.5 * h_)
                band_.phi[c] = std::copysign(4 * h_, band_.phi[c]);
    });
    classify_elements();
    classify_cells();
    find_even_cells();
    slope_.resize(band_.size());
    next_.resize(band_.size());
    moved_since_refresh_ = 0;
    time_of_refresh_ = report_.time;
}

Vec3 Advance::node(std::size_t c) const {
    const Band::Cell& cell = band_.cells[c];
    return band_.domain.node(cell.i, cell.j, cell.k);
}

Vec3 Advance::nearest(std::size_t c) const {
    return nearest_point(band_.domain, plates_[element_[c]], node(c));
}

Foot Advance::foot(std::size_t c) const {
    return foot_of(node(c), band_.phi[c], nearest(c), surface_.normal[element_[c]], h_);
}

/// full: whether phi of a cell is the time at which the front passes it, but for the rate: where
/// the rate does not depend on the normal and no neighbour has a faster one to spread from.
void Advance::find_even_cells() {
    if (planar_ || (!something_constant_ && layered_.empty())) return;
    RawVector<double> rate(band_.size()); // NaN where it depends on the normal
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const int e = element_[c];
            rate[c] = 0;
            if (e < 0) continue;
            const int row =
                row_[c].row == layered_row ? finder_.row_below(e, foot(c)) : row_[c].row;
            rate[c] = tables_.constant(row) ? tables_.rate(row, 0)
                                            : std::numeric_limits<double>::quiet_NaN();
        }
    });
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            const double most = even_share * std::fabs(rate[c]);
            fan_[c] = std::all_of(band_.neighbour[c].begin(), band_.neighbour[c].end(),
                                  [&](int n) { return n < 0 || std::fabs(rate[n]) <= most; });
        }
    });
}

void Advance::classify_cells() {
    row_.resize(band_.size());
    fan_.resize(band_.size());
    for_ranges(band_.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t c = begin; c < end; ++c) {
            row_[c] = {};
            fan_[c] = 0;
            const int e = element_[c];
            if (e < 0) continue;
            row_[c].row = meets_layers(c) || resting_sides(c) ? layered_row : below_[e].row;
            if (!planar_) continue;
            blend(row_[c], place_of(c));
            fan_[c] = in_fan(c);
        }
    });
    const std::vector<int> cells =
        indices_where(band_.size(), [&](std::size_t c) { return row_[c].row == layered_row; });
    layered_.resize(cells.size());
    for_ranges(cells.size(), [&](std::size_t begin, std::size_t end) {
        for (std::size_t l = begin; l < end; ++l) {
            const int c = cells[l];
            LayeredCell& at = layered_[l] = {};
            at.cell = c;
            at.foot = foot(c);
            at.phi0 = band_.phi[c];
            at.resting = resting_sides(c);
            at.place = place_of(c);
            find_wall(at);
        }
    });
}

/// Whether an interface or a grown film may lie between a cell and where its foot goes until the
/// next refresh. If not, what lies below the foot lies below the centre of its element.
bool Advance::meets_layers(std::size_t c) const {
    const int e = element_[c];
    const double z = (band_.cells[c].k + 0.5) * h_;
    if (below_[e].clear && std::fabs(z - below_[e].z) <= cell_reach * h_) return false;
    const double z_foot = nearest(c).z;
    const double middle = 0.5 * (z + z_foot), spread = 0.5 * std::fabs(z - z_foot);
    return finder_.near(e, middle, foot_reach * h_ + spread);
}

/// Where on the surface, as it was when the rates were found, the foot of a cell lies.
BetweenCentres Advance::place_of(std::size_t c) const {
    return between_centres(band_.domain, surface_, element_[c], nearest(c));
}

/// Whether the nearest point of the surface is a corner that the cell sees from well beyond both
/// sides.
bool Advance::in_fan(std::size_t c) const {
    const Foot at = foot(c);
    return at.corner && -at.inward.dot(surface_.normal[element_[c]]) < fan_cosine;
}

/// Takes in the row that the neighbour has for the same material, between their centres.
void Advance::blend(RowPair& rows, const BetweenCentres& place) const {
    if (rows.row < 0 || place.partner < 0 || place.share < 0) return;
    rows.other = rates_.row(place.partner, rates_.material[rows.row]);
    rows.share = rows.other < 0 ? 0 : place.share;
}

/// Sides where the front of cell c meets one that turns by more than 45 degrees and rests, or
/// nearly.
unsigned Advance::resting_sides(std::size_t c) const {
    if (!something_rests_) return 0;
    const int e = element_[c];
    const double rate = own_rate_[e];
    if (rate <= 0) return 0;
    unsigned sides = 0;
    for (int side = 0; side < 6; ++side) {
        const int n = band_.neighbour[c][side], other = n < 0 ? -1 : element_[n];
        if (other < 0 || other == e || std::fabs(own_rate_[other]) > resting_share * rate) continue;
        if (surface_.normal[e].dot(surface_.normal[other]) < 0.7) sides |= 1u << side;
    }
    return sides;
}

/// Whether resting_sides can find any.
bool Advance::may_rest() const {
    double least = std::numeric_limits<double>::infinity(), most = 0;
    for (const double rate : own_rate_) {
        least = std::min(least, std::fabs(rate));
        most = std::max(most, rate);
    }
    return !(least > resting_share * most);
}

/// A front that runs down along a resting wall leaves the wall behind it: at an inner edge the
/// distance to the surface is at most the distance to the wall's plane, on either side of it.
void Advance::find_wall(LayeredCell& at) const {
    const std::size_t c = at.cell;
    const int e = element_[c];
    const Vec3 p = node(c);
    const auto apart = [this](Vec3 d) {
        if (band_.domain.sides == Sides::periodic) {
            const double wx = band_.domain.width_x(), wy = band_.domain.width_y();
            d.x -= wx * std::round(d.x / wx);
            if (!planar_) d.y -= wy * std::round(d.y / wy);
        }
        return d;
    };
    for (int side = 0; side < 6; ++side) {
        if (!(at.resting >> side & 1)) continue;
        const int w = element_[band_.neighbour[c][side]];
        const Vec3& n = surface_.normal[w];
        const Vec3& wall = plates_[w].centre;
        if (apart(wall - plates_[e].centre).dot(surface_.normal[e]) <= 0) continue;
        const double distance = apart(p - wall).dot(n);
        if (distance >= at.wall) continue;
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
    element_window_.resize(surface_.size());
    element_rate_.resize(surface_.size());
    below_.resize(surface_.size());
    RawVector<char> layered(surface_.size());
    const double constant =
        largest_of_ranges(surface_.size(), [&](std::size_t begin, std::size_t end) {
            for (std::size_t e = begin; e < end; ++e) {
                const Plate& plate = plates_[e];
                const Vec3& n = surface_.normal[e];
                element_tilt_[e] = tilt_of(planar_, n.x, n.y, n.z);
                below_[e].z = plate.centre.z;
                below_[e].row =
                    finder_.row_below(static_cast<int>(e), {plate.centre, -plate.normal, false});
            }
            bool any = false;
            for (std::size_t e = begin; e < end; ++e) {
                const Plate& plate = plates_[e];
                const int id = static_cast<int>(e), row = below_[e].row;
                any = any || (tables_.constant(row) && tables_.moves(row));
                element_rate_[e] = tables_.rate(row, element_tilt_[e].angle);
                element_window_[e] = tables_.window(row, element_tilt_[e].angle);
                // Growth starts a film, so such elements are layered too.
                layered[e] = element_rate_[e] < 0 || finder_.near(id, plate.centre.z, reach);
                below_[e].clear = !finder_.near(id, plate.centre.z,
                                                (foot_reach + cell_reach) * h_ + plate.radius);
            }
            return any ? 1.0 : 0.0;
        });
    something_constant_ = constant > 0;
    layered_elements_ =
        indices_where(layered.size(), [&](std::size_t e) { return layered[e] != 0; });
    own_rate_ = element_rate_;
    something_rests_ = may_rest();
    for (const int e : layered_elements_)
        element_rate_[e] = 0;
}

Speed Advance::find_layers(LayeredCell& at) const {
    const std::size_t c = at.cell;
    const int e = element_[c];
    const double* phi = band_.phi.data();
    Slopes s = slopes(phi, c, 0, false);
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
        if (next < 0 || (at.unseen >> side & 1)) continue;
        if (!(at.resting >> side & 1) && !finder_.pinned(next, phi, e, element_tilt_[e].angle))
            continue;
        const double n = (&surface_.normal[e].x)[side / 2] * (side & 1 ? h_ : -h_);
        const double there = phi[next];
        if (there > 0 && there < phi[c] + n - 0.05 * h_) at.beside |= 1u << side;
    }
    s = special_slopes(phi, at);
    finder_.for_cell(c, phi, length(), e, foot, layer_reach * h_, at.layers);
    Speed most;
    for (int k = 0; k < at.layers.count; ++k) {
        Speed speed;
        blend(at.layers.row[k], at.place);
        if (at.layers.row[k].row >= 0) {
            const double part = change(s, at.layers.row[k], {}, false, speed);
            speed.smooth = false; // a film may end within the cell
            most.waves = std::max(most.waves, counted(part, speed));
        }
        if (std::fabs(phi[c]) < h_) most.rate = std::max(most.rate, std::fabs(speed.rate));
    }
    return most;
}

} // namespace rille::geometry
