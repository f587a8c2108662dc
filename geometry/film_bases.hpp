// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/front.hpp"

#include <deque>
#include <functional>
#include <vector>

namespace rille::geometry {

/// The solid below each grown film, as the front left it when the film began to cover it. While it
/// is covered it rests, so it needs no redistancing.
///
/// Thicknesses that ride on the front are exact for films thinner than a cell, but an amount per
/// area says little about a thick film at an edge or a corner: a directed etch that runs down along
/// a film on a wall lays bare more and more of that film, and where a corner closes amounts pile
/// up. There the distance between the front and the base is the thickness.
class FilmBases {
public:
    /// below[f](p) [nm]: signed distance at the start to the solid below film f of GrownFilms, < 0
    /// in it, exact within 4 cells. z_low and z_high [nm] bound the surfaces of all of them.
    /// mixed[f]: film f grows mixed with film f - 1, on one base, that of the deepest; none if
    /// empty.
    FilmBases(const Domain&, const std::vector<std::function<double(const Vec3&)>>& below,
              double z_low, double z_high, std::vector<char> mixed = {});

    /// After the front has moved: bases recede where it has passed into them.
    void follow(const Front&);
    /// On the elements of `surface`, the front's present one, distances to the bases replace what
    /// was carried of films thicker than 1.5 cells, and of thinner ones where it is off by more
    /// than half a cell; films that grow mixed keep their proportions. Returns how many thicknesses
    /// were replaced.
    int settle(const Front&, const Surface& surface, GrownFilms&) const;
    /// Distance [nm] from p to the solid below film f, interpolated; clamped to +-4 cells.
    double distance(int film, const Vec3& p) const;
    std::size_t memory_bytes() const;
    /// Hands everything that follow() changes to `archive`, which writes or reads it.
    template <class Archive, class Self>
    static void visit(Archive& archive, Self& self) {
        for (auto& grid : self.grids_) {
            archive(grid.k_low);
            archive(grid.layers);
        }
    }

private:
    struct Grid {
        int k_low = 0;
        std::deque<std::vector<float>> layers; ///< by k; cells_x x cells_y values [nm]
    };
    double value(const Grid&, int i, int j, int k) const;
    double thickness_at(int film, const Vec3& p, double own) const;
    bool mixes(int film) const { return film < int(mixed_.size()) && mixed_[film]; }
    float& slot(Grid&, int i, int j, int k);

    Domain domain_;
    float reach_; ///< [nm]
    std::vector<Grid> grids_;
    std::vector<char> mixed_;
};

} // namespace rille::geometry
