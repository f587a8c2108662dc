// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <memory>

namespace rille::geometry {

/// Where a ray ended. `direction` is the unit direction of flight at the end, after the folds at
/// mirror sides; `point` lies inside the period. Revolved: both are turned about the axis so that
/// the point lies in the half-plane y = 0, x >= 0, where the element's normal holds. `lost` =
/// numerically neither (counted).
struct Hit {
    enum class Kind : std::uint8_t { surface, open, lost };
    Kind kind = Kind::open;
    int element = -1;
    double distance = 0; ///< path length [nm]
    Vec3 point;
    Vec3 direction;
};

/// A ray to trace: `direction` is unit, `from_element` is the element that it leaves (never hit at
/// its start), or -1 for a ray that starts in the gas.
struct RayStart {
    Vec3 origin, direction;
    int from_element = -1;
};

/// First hits of straight rays on one Surface, with mirror or periodic sides built in. A ray that
/// crosses z_open upwards is in the open; z_open must lie above the whole surface. Extruded: rays
/// are three-dimensional, the surface infinite along y. Revolved: three-dimensional likewise, from
/// anywhere in the cell; the cylinder x = radius of the cell mirrors (frustum_caster.hpp says why).
/// Thread-safe; the same ray gives the same bits from any thread.
class RayCaster {
public:
    RayCaster(const Domain&, const Surface&, double z_open);
    ~RayCaster();
    RayCaster(const RayCaster&) = delete;
    RayCaster& operator=(const RayCaster&) = delete;

    /// direction: unit. `from_element` is the element the ray leaves (never hit at its start), or
    /// -1 for a ray that starts in the gas.
    Hit trace(const Vec3& origin, const Vec3& direction, int from_element) const;
    /// The same for `count` rays at once, bit for bit; quicker in extruded.
    void trace(const RayStart* rays, std::size_t count, Hit* hits) const;
    /// Whether the ray ends in the open: as trace, but for round-off; quicker from the walls of a
    /// revolved hole.
    bool opens(const Vec3& origin, const Vec3& direction, int from_element) const;
    double z_open() const;
    /// Rays traced and rays lost so far.
    std::uint64_t traced() const;
    std::uint64_t lost() const;

private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

} // namespace rille::geometry
