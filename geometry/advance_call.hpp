// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/between_centres.hpp"
#include "geometry/closest_element.hpp"
#include "geometry/front.hpp"
#include "geometry/hamiltonian.hpp"
#include "geometry/layers.hpp"

#include <limits>
#include <vector>

namespace rille::geometry {

constexpr int layered_row = -2;       ///< marks cells whose row depends on where the front is
constexpr double layer_reach = 0.6;   ///< [cells] more than any sub-step moves
constexpr double refresh_move = 0.75; ///< [cells] nearest elements and band hold for this far
/// [cells] from the foot of a cell: what it may meet until the next refresh
constexpr double foot_reach = refresh_move + 2 * layer_reach + 0.5;
constexpr unsigned direct_sides = 0x3f; ///< of LayeredCell::unseen: without the second neighbours
constexpr double fan_cosine = 0.985; ///< 10 degrees: the front turns by more at the foot of a fan
constexpr double resting_share =
    0.5; ///< a wall rests if slower than this share of the front beside it

/// A cell near an interface or a grown film, or beside a wall that rests: where its foot was when
/// phi was phi0.
struct LayeredCell {
    int cell = 0;
    Foot foot;
    double phi0 = 0;
    unsigned resting = 0; ///< sides (bits) whose neighbour belongs to a wall that rests
    unsigned unseen = 0;  ///< sides behind an interface that the front runs along (6 + s: the
                          ///< second neighbour on side s)
    unsigned beside = 0;  ///< sides whose neighbour is nearer to a resting wall than to this front
    double wall = std::numeric_limits<double>::infinity(); ///< [nm] bound of phi at a resting wall
    double wall_rate = 0;
    bool directional = false; ///< the rate below the foot depends on the normal
    Layers layers;
    BetweenCentres place;
};

/// One call of `advance`.
class Advance {
public:
    Advance(Front& front, const Surface& surface, const NormalRates& rates, const Stack& stack,
            GrownFilms& films, const std::vector<int>& growth_film, const AdvanceLimits& limits)
        : front_(front), band_(front.band()), surface_(surface), rates_(rates), tables_(rates),
          films_(films), growth_film_(growth_film), limits_(limits),
          finder_(band_, rates, tables_, stack, films), planar_(band_.domain.planar_contour()),
          h_(band_.domain.spacing) {
        report_.moved.assign(surface.size(), 0.0);
    }

    AdvanceReport run();

private:
    void refresh();
    void classify_cells();
    void classify_elements();
    Vec3 node(std::size_t c) const;
    Vec3 nearest(std::size_t c) const; ///< point of its element
    Foot foot(std::size_t c) const;
    bool meets_layers(std::size_t c) const;
    BetweenCentres place_of(std::size_t c) const;
    unsigned resting_sides(std::size_t c) const;
    bool in_fan(std::size_t c) const;
    void find_wall(LayeredCell&) const;
    Slopes special_slopes(const double* phi, const LayeredCell&) const;
    Slopes slopes(const double* phi, std::size_t c, unsigned unseen, bool directional) const {
        const Limiter limiter = directional ? Limiter::directional : Limiter::isotropic;
        return planar_ ? slopes_2d(band_, phi, c, 1 / h_, unseen, limiter)
                       : slopes_3d(band_, phi, c, 1 / h_, unseen, limiter);
    }
    void find_even_cells();
    bool may_rest() const;
    double change(const Slopes&, const RowPair&, const RateWindow&, bool fan, Speed&) const;
    void blend(RowPair&, const BetweenCentres&) const;
    template <class Take>
    void sweep(const double* phi, std::size_t begin, std::size_t end, const Take& take) const;
    template <class Body>
    void over_layered(const Body& body);
    double layered_change(const Slopes&, const Layers&, bool fan, double dt, double& waves) const;
    double counted(double change, const Speed&) const;
    Speed first_stage();
    Speed find_layers(LayeredCell&) const; ///< its largest speeds
    double choose_step(const Speed&) const;
    double second_stage(double dt);
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
    bool planar_;
    double h_;
    AdvanceReport report_;
    double moved_since_refresh_ = 0; ///< [cells]
    double time_of_refresh_ = 0;     ///< [s]
    RawVector<Plate> plates_;        ///< the elements where they were at the last refresh
    RawVector<int> element_;         ///< of each cell, -1: none
    RawVector<RowPair> row_;
    /// planar contour: whether the nearest point is a sharp corner; full: see find_even_cells.
    RawVector<char> fan_;
    RawVector<double> slope_, next_; ///< dphi/dt, first of the first stage; phi after that
    std::vector<LayeredCell> layered_;
    std::vector<int> layered_elements_;
    RawVector<Tilt> element_tilt_;
    /// What cells ask about their element, together in memory.
    struct Below {
        double z;   ///< [nm] of its centre
        int row;    ///< of the material below it
        bool clear; ///< no interface or grown film within reach of its cells
    };
    RawVector<Below> below_;
    bool something_rests_ = false;         ///< see resting_sides
    bool something_constant_ = false;      ///< some element has a rate without regard to the normal
    RawVector<RateWindow> element_window_; ///< of the material below it, about its normal
    RawVector<double> element_rate_, own_rate_; ///< own: before films are peeled
};

} // namespace rille::geometry
