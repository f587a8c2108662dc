// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <vector>

namespace rille::engine {

// Points of the unit cube, each made on its own in time and memory that do not grow with their
// number.

/// Point `index` of the Sobol sequence with the direction numbers of Joe and Kuo (2008), from the
/// origin on. At most 21201 dimensions.
std::vector<double> sobol_point(std::size_t dimensions, std::size_t index);

/// Point `index` of a Latin hypercube of `count` points: along each axis the points lie in
/// different ones of `count` equal parts, in an order and at places within the part that the seed
/// decides (McKay, Beckman and Conover 1979).
std::vector<double> latin_hypercube_point(std::size_t dimensions, std::size_t count,
                                          std::uint64_t seed, std::size_t index);

} // namespace rille::engine
