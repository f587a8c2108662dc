// SPDX-License-Identifier: Apache-2.0
#include "fluxes/yields.hpp"

#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double degree = 3.14159265358979323846 / 180.0;

struct AngleFactor {
    double cosine;

    double operator()(const FlatAngle&) const { return 1.0; }
    double operator()(const PlateauCosine& law) const {
        const double edge = std::cos(law.plateau_deg * degree);
        return cosine >= edge ? 1.0 : cosine / edge;
    }
    double operator()(const PlateauLinear& law) const {
        const double theta = std::acos(cosine) / degree;
        return theta <= law.plateau_deg ? 1.0 : (90.0 - theta) / (90.0 - law.plateau_deg);
    }
    double operator()(const YamamuraAngle& law) const {
        const double x = 1.0 / cosine;
        const double slope = law.f * std::cos(law.optimum_deg * degree);
        return std::exp(law.f * std::log(x) - slope * (x - 1.0));
    }
};

} // namespace

double angle_factor(const AngleLaw& law, double cos_incidence) {
    if (cos_incidence <= 0.0) return 0.0;
    return std::visit(AngleFactor{std::fmin(cos_incidence, 1.0)}, law);
}

double YieldFunction::operator()(double energy_ev, double cos_incidence) const {
    if (cos_incidence <= 0.0) return 0.0;
    return scale * energy_yield(energy, energy_ev) * angle_factor(angle, cos_incidence);
}

} // namespace rille::fluxes
