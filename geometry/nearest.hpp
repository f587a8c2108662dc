// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// Finds the element whose centre lies nearest to a point, across the sides of the period. Equal
/// distances go to the smaller index.
class NearestElement {
public:
    NearestElement(const Domain&, const Surface&);
    /// -1 for an empty surface. Points within a few cells of the surface are found fast.
    int operator()(const Vec3& point) const;

private:
    long cell_of(int i, int j, int k) const;
    const Domain domain_;
    const Surface& surface_;
    double size_;
    int nx_, ny_, nz_;
    double z_low_;
    std::vector<int> first_, elements_; ///< elements by cell, in ascending order inside each
};

} // namespace rille::geometry
