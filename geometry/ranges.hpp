// SPDX-License-Identifier: Apache-2.0
// Private to geometry: parallel loops over fixed ranges, so that results do not depend on threads.
#pragma once

#include <algorithm>
#include <cstddef>
#include <tbb/parallel_for.h>

namespace rille::geometry {

/// Runs body(first, last) over consecutive ranges of [0, size) of `grain` items; bodies must write
/// to disjoint outputs.
template <class Body>
void over_ranges(std::size_t size, std::size_t grain, const Body& body) {
    const std::size_t count = (size + grain - 1) / grain;
    tbb::parallel_for(std::size_t(0), count,
                      [&](std::size_t r) { body(r * grain, std::min(size, (r + 1) * grain)); });
}

} // namespace rille::geometry
