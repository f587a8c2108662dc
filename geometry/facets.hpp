// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/surface.hpp"

#include <cmath>

namespace rille::geometry {

/// A quad {a, b, c, d} of a full surface need not be planar. What rays meet are its two facets, the
/// triangles 0 = {a, b, d} and 1 = {c, d, b}; of an element with three corners facet 1 is empty.
/// Rays must leave from a facet and on its outer side, or they start inside the solid.
struct Facet {
    Vec3 a, b, c; ///< anticlockwise seen from the gas

    Vec3 centre() const { return (a + b + c) / 3.0; }
    Vec3 cross() const { return (b - a).cross(c - a); } ///< twice the area along the normal
};

inline Facet facet(const std::vector<Vec3>& vertices, const std::array<int, 4>& quad, int which) {
    const Vec3 &b = vertices[quad[1]], &d = vertices[quad[3]];
    return which == 0 ? Facet{vertices[quad[0]], b, d} : Facet{vertices[quad[2]], d, b};
}

/// Facet of an element on which a point of it lies.
inline int facet_at(const std::vector<Vec3>& vertices, const std::array<int, 4>& quad,
                    const Vec3& point) {
    if (quad[2] == quad[3]) return 0;
    const Vec3 &a = vertices[quad[0]], &b = vertices[quad[1]], &c = vertices[quad[2]],
               &d = vertices[quad[3]];
    const Vec3 across = (d - b).cross((c - a).cross(d - b));
    const double of_a = (a - b).dot(across), of_c = (c - b).dot(across);
    const double at = (point - b).dot(across);
    // A quad may be folded over its diagonal; then the facet that reaches further that way.
    if (of_a * of_c > 0) return std::fabs(of_a) < std::fabs(of_c);
    return at * (of_a - of_c) < 0;
}

/// Unit normal of the surface at a point of an element: that of the facet; in extruded and for
/// empty facets that of the element.
inline Vec3 normal_at(const Surface& s, int element, const Vec3& point) {
    const std::array<int, 4>& quad = s.corners[element];
    if (quad[2] < 0) return s.normal[element];
    const Vec3 cross = facet(s.vertices, quad, facet_at(s.vertices, quad, point)).cross();
    const double length = cross.length();
    return length > 1e-9 * s.area[element] ? cross / length : s.normal[element];
}

} // namespace rille::geometry
