// SPDX-License-Identifier: Apache-2.0
#include "geometry/stack.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::geometry {

Stack::Stack(std::vector<Film> films) : films_(std::move(films)) {
    RILLE_CHECK(!films_.empty(), "a stack needs at least one film");
    for (std::size_t f = 0; f + 1 < films_.size(); ++f)
        RILLE_CHECK(films_[f].bottom == films_[f + 1].top && films_[f].top > films_[f].bottom,
                    "films must follow each other without gaps: " + films_[f].name);
}

int Stack::film_at(double z) const {
    const auto below = std::partition_point(films_.begin(), films_.end(),
                                            [z](const Film& film) { return film.bottom >= z; });
    return static_cast<int>(std::min<std::ptrdiff_t>(
        below - films_.begin(), static_cast<std::ptrdiff_t>(films_.size()) - 1));
}

double Stack::distance_to_interface(const Vec3& p, const Vec3& direction) const {
    const double none = std::numeric_limits<double>::infinity();
    if (direction.z == 0.0) return none;
    const int film = film_at(p.z);
    const double interface = direction.z < 0 ? films_[film].bottom : films_[film].top;
    const bool last = direction.z < 0 ? film + 1 == static_cast<int>(films_.size()) : film == 0;
    return last ? none : std::max(0.0, (interface - p.z) / direction.z);
}

} // namespace rille::geometry
