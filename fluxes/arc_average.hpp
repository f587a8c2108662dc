// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <vector>

namespace rille::fluxes {

/// Ways along which an image is turned over: bits of ArcAverage::Part::image.
constexpr std::uint8_t along_x = 1, along_y = 2;

/// A direction as it points in an image.
inline geometry::Vec3 mirrored(const geometry::Vec3& v, std::uint8_t image) {
    return {image & along_x ? -v.x : v.x, image & along_y ? -v.y : v.y, v.z};
}

/// Averages over a few cells of surface that lose nothing and never reach across a corner.
///
/// extruded: box of five cells of arc inside a smooth piece, reflected at the piece's ends, so that
/// a constant stays constant and the sum of value times length is kept to round-off; at a mirror
/// side what is reflected is the image, whose directions along x are turned over. revolved: the
/// same with the sum of value times area, and weights that fade between normals 15 and 45 degrees
/// apart in place of an edge to the piece at a corner; the axis is a mirror too. full: elements
/// that share a corner, twice over, within the corner angle, images in mirror sides among them;
/// sums of value times area are kept.
struct ArcAverage {
    struct Part {
        int element;
        std::uint8_t image; ///< in a mirror side: how it is turned over; 0: the element itself
        double weight;
    };
    std::vector<int> first;  ///< parts of element e: [first[e], first[e + 1])
    std::vector<Part> parts; ///< weights of an element sum to 1

    double of(const std::vector<double>& value, int element) const {
        double sum = 0;
        for (int i = first[element]; i < first[element + 1]; ++i)
            sum += parts[i].weight * value[parts[i].element];
        return sum;
    }
    /// Of a component along x (not of one along the element's own normal).
    double of_sideways(const std::vector<double>& value, int element) const {
        double sum = 0;
        for (int i = first[element]; i < first[element + 1]; ++i)
            sum += (parts[i].image & along_x ? -1 : 1) * parts[i].weight * value[parts[i].element];
        return sum;
    }
};

/// A corner: neighbouring elements whose normals differ by more than this [rad].
constexpr double corner_angle = 30 * 3.14159265358979323846 / 180;

ArcAverage arc_average(const geometry::Domain&, const geometry::Surface&);

/// Unit normals averaged with those weights.
std::vector<geometry::Vec3> averaged_normals(const geometry::Surface&, const ArcAverage&);

} // namespace rille::fluxes
