// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/shape_ledger.hpp"
#include "fluxes/causes.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;

/// How files and pictures show one cause of a rate.
struct CauseLook {
    const char* column; ///< in the names of columns: "sputtering_direct_ions"
    const char* label;  ///< for people
    const char* colour; ///< bounces from dark to light; apart in every kind of colour vision
    bool hatched;       ///< sputtering, as against ion-enhanced etching
};
/// In the order of fluxes::CauseRates.
const std::array<CauseLook, fluxes::cause_count>& cause_looks();

/// Names of the supplies of a case in the order of SurfaceStep::supply: "direct_ions",
/// "ions_after_1_bounce", ..., then the neutrals.
std::vector<std::string> supply_names(const Case&);

/// "left wall", "right wall", "wall" or "floor".
const char* face_name(ShapePart::Face);

/// Where an element of the surface lies: "top" (facing up, at the mask bottom or above), "floor",
/// "left wall" and "right wall" of the gas beside it (steeper than 60 deg from horizontal), or
/// "overhang".
/// `is_image`: seen in the other half of a section through the axis of revolution.
const char* region_of(const Case&, const geometry::Surface&, std::size_t element,
                      bool is_image = false);
inline constexpr const char* regions[] = {"top", "left wall", "floor", "right wall", "overhang"};

} // namespace rille::engine
