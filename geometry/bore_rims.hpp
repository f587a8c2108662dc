// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

#include <vector>

namespace rille::geometry {

/// Whether rising rays from the wall of a bore get into the open, without a search for what they
/// hit. Along a rising ray the distance from the axis is a convex function r(z) of the height.
/// Where nothing that comes before an element on the contour (from the axis) stands higher than it,
/// and nothing that comes after it lies lower, the ray gets out if and only if it passes inside
/// every circle above it that comes after; and of those only the vertices of the lower convex hull
/// of the contour's r over z can stop it: elsewhere r(z) < hull < contour. Walls of a hole have a
/// few such rims each, whatever their number of elements.
class BoreRims {
public:
    struct Rim {
        double z, r2; ///< [nm], [nm^2]
    };
    /// radius: of the cell; circles on its side stop nothing.
    BoreRims(const Surface&, double radius);

    /// Whether the rims tell all about rising rays from the element.
    bool serves(int element) const { return first_[element] < first_[element + 1]; }
    /// Whether a ray with r^2 = (a t + 2 b) t + c, z = oz + t / inverse_z gets out.
    bool passes(int element, double a, double b, double c, double oz, double inverse_z) const {
        for (int i = first_[element]; i < first_[element + 1]; ++i) {
            const double t = (rims_[i].z - oz) * inverse_z;
            if (!((a * t + 2 * b) * t + c < rims_[i].r2)) return false;
        }
        return true;
    }

private:
    std::vector<int> first_; ///< rims of element e: [first_[e], first_[e + 1])
    std::vector<Rim> rims_;
};

} // namespace rille::geometry
