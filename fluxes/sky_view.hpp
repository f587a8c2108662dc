// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"
#include "fluxes/launch.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

namespace rille::fluxes {

/// full and revolved: whether an ion from the open gets to a place on the surface.
class SkyView {
public:
    SkyView(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&);

    /// Whether an ion arrives at `at` on element e that comes from the direction `from` (unit, up).
    /// A direction behind the element's own plane matters only for turned normals, next to a convex
    /// edge: an ion from there must get within a cell and a half of the element.
    bool reaches(int e, const Launch& at, const Vec3& from) const;

private:
    bool reached_from_behind(int e, const Vec3& at, const Vec3& from) const;
    bool turns_towards(int e, const Vec3& from) const;
    bool reached_in_round_cell(const Vec3& at, const Vec3& from) const;

    const geometry::Domain& domain_;
    const geometry::Surface& surface_;
    const geometry::RayCaster& caster_;
};

} // namespace rille::fluxes
