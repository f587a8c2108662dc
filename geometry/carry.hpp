// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the two forms of carry_fields.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/grown_films.hpp"

namespace rille::geometry {

struct CarryTask {
    const Surface& from;
    const Surface& to;
    const std::vector<double>& moved;
    const Domain& domain;
    double period_x, period_y; ///< [nm] 0 if mirrored
    bool revolved;             ///< amounts are those of whole frusta
    const std::vector<SurfaceField*>& fields;
};

void carry_contour(const CarryTask&); ///< extruded, revolved
void carry_full(const CarryTask&);

} // namespace rille::geometry
