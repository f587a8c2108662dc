// SPDX-License-Identifier: Apache-2.0
#include "geometry/initial_shape.hpp"

#include "geometry/check.hpp"
#include "geometry/opening_outlines.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;

/// The mask's cross-section in (u, z), u the distance from the opening's outline at z = 0, < 0 in
/// the opening. At height z the outline has moved outwards by z / tan(angle), as a parallel curve,
/// so that a distance in this half-plane is one in space.
class MaskProfile {
public:
    explicit MaskProfile(const MaskShape& mask)
        : top_(mask.thickness), radius_(mask.corner_radius) {
        const double angle = mask.sidewall_angle_deg * pi / 180;
        RILLE_CHECK(angle > 0 && angle < pi, "sidewall angle out of range");
        cosine_ = mask.sidewall_angle_deg == 90 ? 0 : std::cos(angle);
        sine_ = mask.sidewall_angle_deg == 90 ? 1 : std::sin(angle);
        RILLE_CHECK(radius_ * (1 - cosine_) <= top_ * (1 + 1e-12),
                    "corner radius exceeds the mask");
        centre_u_ = (radius_ + cosine_ * (top_ - radius_)) / sine_;
        centre_z_ = top_ - radius_;
        wall_u_ = centre_u_ - radius_ * sine_;
        wall_z_ = centre_z_ + radius_ * cosine_;
    }

    double distance(double u, double z) const {
        const double du = u - centre_u_, dz = z - centre_z_;
        // In the sector of the rounded corner, between the wall's normal and straight up.
        const bool at_corner = du < 0 && du * cosine_ + dz * sine_ > 0;
        const double from_centre = at_corner ? std::sqrt(du * du + dz * dz) : 0;
        double d2 = squared(u > 0 ? u : 0, z);                                   // floor
        d2 = std::min(d2, squared(u < centre_u_ ? u - centre_u_ : 0, z - top_)); // top
        const double length2 = wall_u_ * wall_u_ + wall_z_ * wall_z_;
        const double t =
            length2 > 0 ? std::clamp((u * wall_u_ + z * wall_z_) / length2, 0.0, 1.0) : 0;
        d2 = std::min(d2, squared(u - t * wall_u_, z - t * wall_z_));
        double d = std::sqrt(d2);
        if (at_corner) d = std::min(d, std::fabs(from_centre - radius_));
        const bool in_slab =
            z <= top_ && u * sine_ >= z * cosine_ && !(at_corner && from_centre > radius_);
        return z <= 0 || in_slab ? -d : d;
    }

private:
    static double squared(double a, double b) { return a * a + b * b; }

    double top_, radius_, cosine_, sine_;
    double centre_u_, centre_z_; ///< of the rounded top corner
    double wall_u_, wall_z_;     ///< upper end of the straight wall, which starts at (0, 0)
};

} // namespace

std::function<double(const Vec3&)> initial_distance(const Domain& domain, const MaskShape& mask,
                                                    double offset) {
    if (mask.thickness <= 0) return [offset](const Vec3& p) { return p.z - offset; };
    const MaskProfile profile(mask);
    const OpeningOutlines outlines(domain, mask.openings);
    return [profile, outlines, offset](const Vec3& p) {
        return profile.distance(outlines.distance(p.x, p.y), p.z) - offset;
    };
}

} // namespace rille::geometry
