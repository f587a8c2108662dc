// SPDX-License-Identifier: Apache-2.0
// Exact surfaces in full: one quad a cell of the period.
#pragma once

#include "tests/support/shapes.hpp"

#include <vector>

namespace rille::tests {

/// Above a lattice of cells; `at(i, j)` is the place of a vertex, 0 <= i <= cells_x and likewise j.
/// Element i * cells_y + j has it as its corner of lowest x and y.
template <class Place>
Surface lattice(int cells_x, int cells_y, const Place& at) {
    Surface s;
    for (int i = 0; i <= cells_x; ++i)
        for (int j = 0; j <= cells_y; ++j)
            s.vertices.push_back(at(i, j));
    const auto vertex = [&](int i, int j) { return i * (cells_y + 1) + j; };
    for (int i = 0; i < cells_x; ++i)
        for (int j = 0; j < cells_y; ++j)
            add_element(s,
                        {vertex(i, j), vertex(i + 1, j), vertex(i + 1, j + 1), vertex(i, j + 1)});
    return s;
}

} // namespace rille::tests
