// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/grown_films.hpp"
#include "geometry/hamiltonian.hpp"
#include "geometry/stack.hpp"

#include <array>

namespace rille::geometry {

/// What a point of the front meets on its way into the solid: rows of the rate tables (-1: rate 0)
/// and how much of each there is [nm]. The last layer has no end.
struct Layers {
    static constexpr int capacity = 16;
    int count = 0;
    std::array<RowPair, capacity> row{};
    std::array<double, capacity> thickness{};

    void add(int table_row, double depth) {
        if (count == capacity) return;
        row[count] = {table_row, -1, 0};
        thickness[count++] = depth;
    }
};

/// Distance [nm] the front covers in `time` [s] with normal at `angle`: each layer at its own rate,
/// t_k = h_k / r_k while the sum is below `time`. Growth (negative) ends the walk.
/// `share[k]`: part of the time spent in layer k.
double walk(const RateTables&, const Layers&, double angle, double time,
            std::array<double, Layers::capacity>& share);

/// Where the front nearest to a cell is, and which way leads from there into the solid (unit).
struct Foot {
    Vec3 point;  ///< [nm]
    Vec3 inward; ///< -normal of the element; at a corner the line through the cell
    bool corner = false;
};
/// Foot of a cell at p on element e; phi tells the side the cell is on.
Foot foot_of(const Vec3& p, double phi, const Vec3& nearest, const Vec3& normal, double spacing);

/// Finds the layers below points of the front.
class LayerFinder {
public:
    LayerFinder(const Band&, const NormalRates&, const RateTables&, const Stack&,
                const GrownFilms&);

    /// Whether an interface or a grown film can matter to a point that stays within `reach` [nm] of
    /// height z.
    bool near(int element, double z, double reach) const;
    /// Row for the material just inside the solid below a foot on element e, no grown film.
    int row_below(int element, const Foot&) const;
    /// Layers below a foot, until more than `reach` [nm] is gathered or nothing moves.
    void below(int element, const Foot&, double reach, Layers& out) const;
    /// Layers for a cell at phi with gradient length `steep`: as `below`, but a film that the cell
    /// lies in, or that stays solid next to it, is not passed through at the rate of the film its
    /// foot lies in. Keeps lips of slow films sharp.
    void for_cell(std::size_t cell, const double* phi, double steep, int element, const Foot&,
                  double reach, Layers& out) const;
    /// Sides (bits, as in Slopes) across which the film that the cell lies in meets one that holds
    /// still or recedes at less than half its rate, at `angle`: the front runs along that
    /// interface, and what lies beyond has no say in it. Bit 6 + s: the next cell is one of them.
    unsigned unseen_sides(std::size_t cell, const double* phi, int element, const Foot&,
                          double angle) const;

    /// Distance [nm] from a cell to the face of its own film on side 4 (below) or 5 (above).
    double gap(std::size_t cell, int side) const;

    /// Whether the cell lies in the gas right at an interface whose film holds still, at `angle`,
    /// against the film the cell lies in: its phi is the distance to that interface.
    bool pinned(std::size_t cell, const double* phi, int element, double angle) const;

private:
    double grown(int element, Layers& out) const;
    unsigned slow_sides(std::size_t cell, const double* phi, int element, double angle) const;
    void stack_below(int element, Foot foot, double reach, Layers& out) const;
    double step_inside(const Foot&) const;
    /// full: a foot less than the uncertainty of an edge before the end of a slow film lies on the
    /// film behind it: a floor at the foot of a mask belongs to the film.
    Foot past_sliver(int element, Foot) const;
    int film_inside(const Foot&) const;
    int row_of_film(int element, int film) const {
        return rates_.row(element, stack_.films()[film].material);
    }
    /// How far the cell may still be reached at the rate of film `from`, and the film after it (or
    /// -1).
    double limit(std::size_t cell, const double* phi, double steep, int from, int& after) const;

    const Band& band_;
    const NormalRates& rates_;
    const RateTables& tables_;
    const Stack& stack_;
    const GrownFilms& films_;
};

} // namespace rille::geometry
