// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

/// Horizontal rectangle at height z [nm] to send rays through; may reach over the sides.
struct Aim {
    double x0 = 0, x1 = 0, y0 = 0, y1 = 0, z = 0;
    double area() const { return (x1 - x0) * (y1 - y0); }
};

/// Where the openings are, seen from above (full, revolved): a height map of the surface cut at a
/// few levels, each cut split into connected openings. Guides the sampling of the sky from deep
/// points; it may be wrong anywhere without harm to the expected result. Revolved: the
/// square about the opening's outer circle.
class OpeningAims {
public:
    static constexpr double widening = 5;

    OpeningAims(const geometry::Domain&, const geometry::RayCaster&);

    /// Bounding rectangles of the opening nearest to `from`: first at the level that makes it
    /// smallest as seen from there, then at lower ones, each at least `widening` times as wide in
    /// solid angle, so that rays by turns through all of them sample the way up evenly in the
    /// logarithm of the height. Empty where the sky is wide.
    std::vector<Aim> from(const geometry::Vec3& from) const;

private:
    struct Cell {
        int opening = -1;   ///< nearest opening of the level
        int di = 0, dj = 0; ///< periods between the cell and the opening's frame
    };
    struct Level {
        double z = 0;
        std::vector<Cell> cells;
        std::vector<Aim> openings;
    };
    void read_heights(const geometry::RayCaster&);
    void flood(Level&) const;
    void spread(Level&, std::vector<int>& front) const;
    void widen_at_mirrors(Aim&) const;

    geometry::Domain domain_;
    std::vector<double> height_;
    std::vector<Level> levels_;
};

} // namespace rille::fluxes
