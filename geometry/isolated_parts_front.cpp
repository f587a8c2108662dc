// SPDX-License-Identifier: Apache-2.0
#include "geometry/isolated_parts.hpp"

namespace rille::geometry {

std::vector<IsolatedPart> find_isolated_parts(const Front& front, const Surface& surface) {
    return find_isolated_parts(front.domain(), surface);
}

} // namespace rille::geometry
