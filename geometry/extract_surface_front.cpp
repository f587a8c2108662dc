// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"
#include "geometry/front.hpp"

namespace rille::geometry {

Surface extract_surface(const Front& front) {
    return extract_surface(front.band());
}

} // namespace rille::geometry
