// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sky_view.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {

using geometry::Hit;

namespace {

/// Brings a coordinate into the domain.
void fold(const geometry::Domain& domain, double& at, double& direction, double low, double width) {
    const double periods = domain.sides == geometry::Sides::mirror ? 2 * width : width;
    at -= low + periods * std::floor((at - low) / periods);
    if (at > width) {
        at = 2 * width - at;
        direction = -direction;
    }
    at += low;
}

} // namespace

SkyView::SkyView(const geometry::Domain& domain, const geometry::Surface& surface,
                 const geometry::RayCaster& caster)
    : domain_(domain), surface_(surface), caster_(caster) {}

bool SkyView::reaches(int e, const Launch& at, const Vec3& from) const {
    return from.dot(at.normal) > 0 ? caster_.opens(at.point, from, e)
                                   : reached_from_behind(e, at.point, from);
}

bool SkyView::reached_from_behind(int e, const Vec3& at, const Vec3& from) const {
    if (domain_.revolved()) return turns_towards(e, from) && reached_in_round_cell(at, from);
    const double path = (caster_.z_open() - at.z) / from.z;
    Vec3 origin = at + from * path, direction = -from;
    fold(domain_, origin.x, direction.x, domain_.x_min(), domain_.width_x());
    fold(domain_, origin.y, direction.y, domain_.y_min(), domain_.width_y());
    const Hit hit = caster_.trace(origin, direction, -1);
    return hit.kind == Hit::Kind::surface && hit.distance > path - 1.5 * domain_.spacing;
}

/// Whether the contour turns towards a direction within four cells of an element, so that an
/// ion from there may get as near.
bool SkyView::turns_towards(int e, const Vec3& from) const {
    for (const bool back : {false, true}) {
        double way = 0;
        for (int f = e; f >= 0 && way < 4 * domain_.spacing;
             f = back ? surface_.previous[f] : surface_.next[f]) {
            if (surface_.normal[f].dot(from) > 0) return true;
            way += surface_.length(f);
        }
    }
    return false;
}

/// reached_from_behind where the side is a cylinder: back along the way, with its reflections
/// there, to where it comes from the open.
bool SkyView::reached_in_round_cell(const Vec3& at, const Vec3& from) const {
    constexpr int most_reflections = 16; // more: it comes along the horizon
    const double path = (caster_.z_open() - at.z) / from.z, radius = domain_.width_x();
    Vec3 start = at, back = from;
    double left = path;
    for (int n = 0; n <= most_reflections; ++n) {
        const double square = back.x * back.x + back.y * back.y;
        const double along = start.x * back.x + start.y * back.y;
        const double within = radius * radius - start.x * start.x - start.y * start.y;
        const double leaves =
            square > 0
                ? (std::sqrt(along * along + square * std::max(0.0, within)) - along) / square
                : left;
        start += back * std::min(left, leaves);
        if (leaves >= left) {
            const Hit hit = caster_.trace(start, -back, -1);
            return hit.kind == Hit::Kind::surface && hit.distance > path - 1.5 * domain_.spacing;
        }
        left -= leaves;
        const Vec3 outwards = Vec3(start.x, start.y, 0).normalized();
        back -= outwards * (2 * outwards.dot(back));
    }
    return false;
}

} // namespace rille::fluxes
