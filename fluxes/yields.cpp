// SPDX-License-Identifier: Apache-2.0
#include "fluxes/yields.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double degree = 3.14159265358979323846 / 180.0;

struct AngleFactor {
    double cosine;

    double operator()(const FlatAngle&) const { return 1.0; }
    double operator()(const PlateauCosine& law) const {
        return cosine >= law.edge ? 1.0 : cosine / law.edge;
    }
    double operator()(const PlateauLinear& law) const {
        const double theta = std::acos(cosine) / degree;
        return theta <= law.plateau_deg ? 1.0 : (90.0 - theta) / (90.0 - law.plateau_deg);
    }
    double operator()(const YamamuraAngle& law) const {
        const double x = 1.0 / cosine;
        return std::exp(law.f * std::log(x) - law.slope * (x - 1.0));
    }
};

/// Reduced nuclear stopping shared by the Yamamura-Tawara and Bohdansky laws.
double reduced_stopping(double e) {
    const double root = std::sqrt(e);
    return 3.441 * root * std::log(e + 2.718) / (1.0 + 6.355 * root + e * (6.882 * root - 1.708));
}

double energy_transfer(double m1, double m2) {
    return 4.0 * m1 * m2 / ((m1 + m2) * (m1 + m2));
}

/// Z1^(2/3) + Z2^(2/3), the screening sum of every form here.
double screening(double z1, double z2) {
    return std::cbrt(z1 * z1) + std::cbrt(z2 * z2);
}

double yamamura_tawara_threshold(const YamamuraTawaraLaw& law) {
    const double gamma = energy_transfer(law.m1, law.m2);
    return law.m1 <= law.m2 ? law.us_ev * (1.0 + 5.7 * law.m1 / law.m2) / gamma
                            : 6.7 * law.us_ev / gamma;
}

struct EnergyYield {
    double energy;

    double operator()(const ConstantLaw& law) const { return law.value; }
    double operator()(const LinearLaw& law) const { return law.per_ev * energy; }
    double operator()(const SquareRootLaw& law) const {
        if (energy <= law.threshold_ev) return 0.0;
        return law.amplitude * (std::sqrt(energy) - std::sqrt(law.threshold_ev));
    }
    double operator()(const YamamuraTawaraLaw& law) const {
        const double threshold = yamamura_tawara_threshold(law);
        if (energy <= threshold) return 0.0;
        const YamamuraTawaraTerms t = yamamura_tawara_terms(law, energy);
        const double collisions = 0.042 * law.q * t.alpha / law.us_ev * t.stopping_ev_a2;
        return collisions / (1.0 + t.big_gamma * t.ke * std::pow(t.eps, 0.3)) *
               std::pow(1.0 - std::sqrt(threshold / energy), law.s);
    }
    double operator()(const BohdanskyLaw& law) const {
        if (energy <= law.threshold_ev) return 0.0;
        const double x = law.threshold_ev / energy;
        return law.q * reduced_stopping(energy / law.etf_ev) * (1.0 - std::cbrt(x * x)) *
               (1.0 - x) * (1.0 - x);
    }
    double operator()(const EcksteinLaw& law) const {
        if (energy <= law.threshold_ev) return 0.0;
        const double e = law.eps_per_ev * energy;
        const double w = e + 0.1728 * std::sqrt(e) + 0.008 * std::pow(e, 0.1504);
        const double stopping = 0.5 * std::log1p(1.2288 * e) / w; // Kr-C potential
        const double x = std::pow(energy / law.threshold_ev - 1.0, law.mu);
        return law.q * stopping * x / (law.lambda / w + x);
    }
};

/// The same law with every energy stretched by `atoms`.
struct Stretched {
    double atoms;

    EnergyLaw operator()(ConstantLaw law) const { return law; }
    EnergyLaw operator()(LinearLaw law) const { return LinearLaw{law.per_ev / atoms}; }
    EnergyLaw operator()(SquareRootLaw law) const {
        law.amplitude /= std::sqrt(atoms);
        law.threshold_ev *= atoms;
        return law;
    }
    EnergyLaw operator()(BohdanskyLaw law) const {
        law.etf_ev *= atoms;
        law.threshold_ev *= atoms;
        return law;
    }
    EnergyLaw operator()(EcksteinLaw law) const {
        law.eps_per_ev /= atoms;
        law.threshold_ev *= atoms;
        return law;
    }
    EnergyLaw operator()(const YamamuraTawaraLaw& law) const {
        RILLE_CHECK(atoms == 1.0, "the Yamamura-Tawara law is for ions of one atom");
        return law;
    }
};

} // namespace

PlateauCosine::PlateauCosine(double degrees)
    : plateau_deg(degrees), edge(std::cos(degrees * degree)) {}

YamamuraAngle::YamamuraAngle(double exponent, double degrees)
    : f(exponent), optimum_deg(degrees), slope(exponent * std::cos(degrees * degree)) {}

YamamuraTawaraTerms yamamura_tawara_terms(const YamamuraTawaraLaw& law, double energy_ev) {
    const auto [z1, m1, z2, m2, us, q, w, s] = law;
    const double r = screening(z1, z2), m = m1 + m2, ratio = m2 / m1;
    YamamuraTawaraTerms t;
    t.gamma = energy_transfer(m1, m2);
    t.alpha = m1 <= m2 ? 0.249 * std::pow(ratio, 0.56) + 0.0035 * std::pow(ratio, 1.5)
                       : 0.0875 * std::pow(ratio, -0.15) + 0.165 * ratio;
    t.eps = 0.03255 / (z1 * z2 * std::sqrt(r)) * m2 / m * energy_ev;
    t.ke = 0.079 * std::pow(m, 1.5) / (std::pow(m1, 1.5) * std::sqrt(m2)) * std::cbrt(z1 * z1) *
           std::sqrt(z2) / std::pow(r, 0.75);
    t.sn = reduced_stopping(t.eps);
    t.stopping_ev_a2 = 84.78 * z1 * z2 / std::sqrt(r) * m1 / m * t.sn; // 84.78: the erratum's
    t.big_gamma = w / (1.0 + std::pow(m1 / 7.0, 3.0));
    t.threshold_ev = yamamura_tawara_threshold(law);
    return t;
}

BohdanskyLaw bohdansky_law(const CollisionPair& pair, double q) {
    const double ratio = pair.m1 / pair.m2, gamma = energy_transfer(pair.m1, pair.m2);
    BohdanskyLaw law;
    law.q = q;
    law.etf_ev = 30.74 * (pair.m1 + pair.m2) / pair.m2 * pair.z1 * pair.z2 *
                 std::sqrt(screening(pair.z1, pair.z2));
    law.threshold_ev = ratio > 0.2 ? 8.0 * pair.us_ev * std::pow(ratio, 0.4)
                                   : pair.us_ev / (gamma * (1.0 - gamma));
    return law;
}

YamamuraAngle yamamura_angle(const CollisionPair& pair, double atom_density, double energy_ev,
                             double sigmund_exponent) {
    constexpr double steepest = 15.0;
    const double r = screening(pair.z1, pair.z2), ratio = pair.m1 / pair.m2;
    const double spacing_a = 10.0 / std::cbrt(atom_density);
    const double screening_a = 0.4685 / std::sqrt(r);
    const double psi = std::pow(screening_a / spacing_a, 1.5) *
                       std::sqrt(pair.z1 * pair.z2 / std::sqrt(r) / energy_ev);
    const double h = pair.m2 > pair.m1 ? 0.834 : 0.18;
    const double threshold = 1.5 * pair.us_ev / energy_transfer(pair.m1, pair.m2) *
                             std::pow(1.0 + 1.38 * std::pow(ratio, h), 2.0);
    const double z = 1.0 - std::sqrt(threshold / energy_ev);
    const double f = z > 0.0 ? sigmund_exponent * (1.0 + 2.5 * (1.0 - z) / z) : steepest;
    return YamamuraAngle(std::min(f, steepest), 90.0 - 286.0 * std::pow(psi, 0.45));
}

double energy_yield(const EnergyLaw& law, double energy_ev) {
    return energy_ev > 0.0 ? std::visit(EnergyYield{energy_ev}, law) : 0.0;
}

YieldFunction shared_by_atoms(const YieldFunction& yield, double atoms) {
    RILLE_CHECK(atoms >= 1.0, "an ion has at least one atom");
    return {std::visit(Stretched{atoms}, yield.energy), yield.angle, yield.scale * atoms};
}

double angle_factor(const AngleLaw& law, double cos_incidence) {
    if (cos_incidence <= 0.0) return 0.0;
    return std::visit(AngleFactor{std::fmin(cos_incidence, 1.0)}, law);
}

double YieldFunction::operator()(double energy_ev, double cos_incidence) const {
    if (cos_incidence <= 0.0) return 0.0;
    return scale * energy_yield(energy, energy_ev) * angle_factor(angle, cos_incidence);
}

} // namespace rille::fluxes
