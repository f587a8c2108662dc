// SPDX-License-Identifier: Apache-2.0
#include "geometry/check.hpp"
#include "geometry/extract_surface.hpp"

namespace rille::geometry {

Surface extract_full(const Band&) {
    RILLE_CHECK(false, "full contouring is not built");
    return {};
}

} // namespace rille::geometry
