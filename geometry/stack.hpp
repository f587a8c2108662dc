// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

#include <string>
#include <vector>

namespace rille::geometry {

/// One flat film below the front. Its interfaces are analytic and never move.
struct Film {
    std::string name;
    int material = 0;  ///< index into the run's material list
    double top = 0;    ///< z of the upper interface [nm]
    double bottom = 0; ///< z of the lower interface [nm]; -infinity for the substrate
};

/// What lies below the front: flat films from top to bottom without gaps (the mask is the first
/// film, with bottom = 0, if there is one). Where the mask has openings the front says so, not
/// the stack. Lookups cost O(log films).
class Stack {
public:
    Stack() = default;
    /// films: from top to bottom; each bottom equals the next top; throws InternalError otherwise.
    explicit Stack(std::vector<Film> films);

    const std::vector<Film>& films() const { return films_; }
    /// Index of the film that holds height z [nm]; heights above the top belong to film 0. On an
    /// interface the film below counts.
    int film_at(double z) const;
    int material_at(double z) const { return films_[film_at(z)].material; }
    /// Distance [nm] from p along unit vector `direction` to the next interface between two films;
    /// infinity if there is none.
    double distance_to_interface(const Vec3& p, const Vec3& direction) const;

private:
    std::vector<Film> films_;
};

} // namespace rille::geometry
