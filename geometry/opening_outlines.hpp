// SPDX-License-Identifier: Apache-2.0
// Private to geometry: the openings of a mask in the plane z = 0.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/initial_shape.hpp"

#include <vector>

namespace rille::geometry {

/// Distance [nm] from (x, y) >= 0 to the ellipse with semi-axes a and b [nm], < 0 inside; to about
/// 1e-14 of a.
double ellipse_distance(double x, double y, double a, double b);

/// All openings with their images beyond the sides.
class OpeningOutlines {
public:
    OpeningOutlines(const Domain&, const std::vector<Opening>&);

    /// Distance [nm] in the plane to the nearest outline, < 0 inside an opening; 1e30 without
    /// openings. Trenches that overlap are one; where vias overlap each other or a trench, the
    /// depth inside the common part counts to the farther of their outlines.
    double distance(double x, double y) const;

private:
    struct Via {
        double x, y, a, b; ///< centre and semi-axes
        double largest;    ///< larger semi-axis
    };
    void add_trench(double from, double to);
    double fold(double v, double low, double width) const;

    Domain domain_;
    std::vector<double> edges_; ///< trench edges, rising: in at even, out at odd positions
    std::vector<Via> vias_;
};

} // namespace rille::geometry
