// SPDX-License-Identifier: Apache-2.0
#include "geometry/carry.hpp"
#include "geometry/check.hpp"

#include <algorithm>

namespace rille::geometry {

void carry_fields(const Surface& from, const Surface& to, const std::vector<double>& moved,
                  const Domain& domain, const std::vector<SurfaceField*>& fields) {
    RILLE_CHECK(moved.size() == from.size(), "one displacement per element");
    for (const SurfaceField* f : fields)
        RILLE_CHECK(f->value.size() == from.size(),
                    "field " + f->name + " does not fit its surface");
    const bool idle = std::all_of(moved.begin(), moved.end(), [](double m) { return m == 0; });
    if (idle && from.vertices == to.vertices && from.corners == to.corners) return;
    if (from.size() == 0 || to.size() == 0) {
        for (SurfaceField* f : fields)
            f->value.assign(to.size(), 0);
        return;
    }
    const bool periodic = domain.sides == Sides::periodic;
    const CarryTask task{from,
                         to,
                         moved,
                         domain,
                         periodic ? domain.width_x() : 0,
                         periodic ? domain.width_y() : 0,
                         domain.revolved(),
                         fields};
    if (domain.planar_contour())
        carry_contour(task);
    else
        carry_full(task);
}

} // namespace rille::geometry
