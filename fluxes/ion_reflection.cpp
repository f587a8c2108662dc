// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_reflection.hpp"

#include "fluxes/sampling.hpp"

#include <boost/math/special_functions/erf.hpp>

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

using geometry::Vec3;

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180;

Vec3 mirrored(const Vec3& v, const Vec3& normal) {
    return v - normal * (2 * v.dot(normal));
}

double normal_share_below(double x) {
    return 0.5 * std::erfc(-x / std::sqrt(2.0));
}
/// Standard normal deviate below which a share u of all lies.
double normal_deviate(double u) {
    namespace policies = boost::math::policies;
    constexpr policies::policy<policies::promote_double<false>> in_double{};
    constexpr double least = 1e-12;
    return -std::sqrt(2.0) * boost::math::erfc_inv(2 * std::clamp(u, least, 1 - least), in_double);
}

} // namespace

double reflection_probability(const IonReflection& law, double cos_incidence) {
    const double theta = std::acos(std::clamp(cos_incidence, 0.0, 1.0)) / degree;
    if (theta <= law.critical_deg || law.critical_deg >= 90) return 0.0;
    const double x = (theta - law.critical_deg) / (90 - law.critical_deg);
    return law.probability * (law.exponent == 1 ? x : std::pow(x, law.exponent));
}

double energy_kept(const IonReflection& law, double ion_amu, double cos_incidence) {
    if (law.collisions <= 0) return 1.0;
    const double theta = std::acos(std::clamp(cos_incidence, 0.0, 1.0));
    const double chi = (pi - 2 * theta) / law.collisions;
    const double mu = law.target_mass_amu / ion_amu;
    const double inside = mu * mu - std::pow(std::sin(chi), 2);
    if (inside < 0 || (mu < 1 && chi > 0.5 * pi)) return 0.0;
    const double root = (std::cos(chi) + std::sqrt(inside)) / (1 + mu);
    return root <= 0 ? 0.0 : std::pow(root, 2 * law.collisions);
}

Vec3 reflected_direction(const IonReflection& law, const Vec3& incoming, const Vec3& mean,
                         const Vec3& own, const std::array<double, 2>& first, std::uint64_t key) {
    constexpr double least = 1e-6; // keeps a ray off the plane that it leaves
    Vec3 specular = mirrored(incoming, incoming.dot(mean) < 0 ? mean : own);
    const auto leaves = [&](const Vec3& d) { return d.dot(own) > least && d.dot(mean) > least; };
    // A wall can be too rough for its averaged normal: then lift the direction off its own plane.
    if (specular.dot(own) <= least) specular = mirrored(incoming, own);
    if (specular.dot(own) <= least)
        specular = (specular + own * (2 * least - specular.dot(own))).normalized();
    if (law.scatter_deg <= 0) return specular;
    // Deflections within and across the plane of incidence are normal. Those within that certainly
    // run into the averaged plane are left out beforehand (tan a >= a), the rest is refused.
    const double sigma = law.scatter_deg * degree, rise = std::clamp(specular.dot(mean), 0.0, 1.0);
    const double level = std::sqrt(1 - rise * rise);
    const Vec3 helper = std::fabs(specular.x) < 0.5 ? Vec3(1, 0, 0) : Vec3(0, 1, 0);
    const Vec3 within =
        level > 1e-6 ? (mean - specular * rise) / level : specular.cross(helper).normalized();
    const Vec3 across = specular.cross(within);
    const double left_out = level > 1e-6 ? normal_share_below(-rise / (level * sigma)) : 0.0;
    constexpr int tries = 64; // at worst one in two is refused at each try
    for (int i = 0; i < tries; ++i) {
        const double u = i == 0 ? first[0] : unit_interval(stream_key(key, 2 * i));
        const double v = i == 0 ? first[1] : unit_interval(stream_key(key, 2 * i + 1));
        const double a = sigma * normal_deviate(left_out + (1 - left_out) * u);
        const double b = sigma * normal_deviate(v);
        const double angle = std::hypot(a, b);
        if (angle >= pi) continue;
        const double stretch = angle > 1e-12 ? std::sin(angle) / angle : 1.0;
        const Vec3 d = specular * std::cos(angle) + (within * a + across * b) * stretch;
        if (leaves(d)) return d.normalized();
    }
    return specular;
}

} // namespace rille::fluxes
