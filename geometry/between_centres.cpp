// SPDX-License-Identifier: Apache-2.0
#include "geometry/between_centres.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {
constexpr double smooth_cosine = 0.8660254037844386; ///< 30 degrees: beyond it there is a corner

/// Whether an element at the end of a chain and its image in the mirror there are smoothly joined.
bool meets_image(const Vec3& normal) {
    return normal.dot(Vec3(-normal.x, normal.y, normal.z)) >= smooth_cosine;
}

} // namespace

BetweenCentres between_centres(const Domain& domain, const Surface& s, int element, Vec3 foot) {
    BetweenCentres place{element, -1, 0};
    if (element < 0 || !domain.planar_contour()) return place;
    if (domain.sides == Sides::periodic)
        foot.x -= domain.width_x() * std::round((foot.x - s.centre[element].x) / domain.width_x());
    const Vec3 along = s.vertices[s.corners[element][1]] - s.vertices[s.corners[element][0]];
    const double length = s.length(element);
    if (!(length > 0)) return place;
    const double ahead =
        std::clamp((foot - s.centre[element]).dot(along) / length, -0.5 * length, 0.5 * length);
    const auto smooth = [&](int partner) {
        return partner >= 0 && s.normal[element].dot(s.normal[partner]) >= smooth_cosine;
    };
    const int onwards = ahead > 0 ? s.next[element] : s.previous[element];
    const int behind = ahead > 0 ? s.previous[element] : s.next[element];
    if (onwards < 0 && meets_image(s.normal[element])) return place;
    place.partner = smooth(onwards) ? onwards : smooth(behind) ? behind : -1;
    if (place.partner < 0) return place;
    place.share = std::fabs(ahead) / (0.5 * (length + s.length(place.partner)));
    if (place.partner != onwards) place.share = -place.share;
    return place;
}

} // namespace rille::geometry
