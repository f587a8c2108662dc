// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <string>
#include <vector>

namespace rille::geometry {

/// A quantity that rides on the surface elements.
/// per_area: an amount per area (film thickness): its integral is carried over exactly.
/// intensive: a value at a point (coverage, error displacement): interpolated at the foot point.
enum class Carry { per_area, intensive };

/// Fields on the elements of one Surface.
struct SurfaceField {
    std::string name;
    Carry carry = Carry::intensive;
    std::vector<double> value; ///< one per element
};

/// Films grown during the run (polymer, liner): thicknesses [nm] on the elements of one Surface.
/// thickness[f][e]; film 0 lies deepest, the last is outermost. material[f] indexes the run's list.
struct GrownFilms {
    std::vector<int> material;
    std::vector<std::vector<double>> thickness;
};

/// Carries fields from the elements of `from` to those of `to` after the front has moved:
/// y_new = x_old - moved * normal, moved[e] [nm] > 0 where the solid receded. Per-area amounts keep
/// their integral to round-off (a concave corner merges, a convex one spreads); where nothing
/// moved and the elements are the same, values are returned bit for bit.
void carry_fields(const Surface& from, const Surface& to, const std::vector<double>& moved,
                  const Domain&, const std::vector<SurfaceField*>& fields);

} // namespace rille::geometry
