// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <variant>

namespace rille::fluxes {

/// Y = A (sqrt E - sqrt Eth) above threshold. Steinbruchel, Appl. Phys. Lett. 55, 1960 (1989)
/// [citation from memory]; exponent 1/2 confirmed by an abstract. E in eV.
struct SquareRootLaw {
    double amplitude = 0;    ///< [eV^-1/2]
    double threshold_ev = 0; ///< >= 0
};
/// Yamamura & Tawara, At. Data Nucl. Data Tables 62, 149 (1996): normal incidence on elements.
struct YamamuraTawaraLaw {
    double z1 = 0, m1 = 0; ///< projectile: atomic number, mass [amu]
    double z2 = 0, m2 = 0; ///< target
    double us_ev = 0;      ///< surface binding energy [eV]
    double q = 1, w = 0, s = 2.5;
};
/// Bohdansky, NIM B 2, 587 (1984) [citation from memory].
struct BohdanskyLaw {
    double q = 0, etf_ev = 0, threshold_ev = 0;
};
/// Eckstein & Preuss fit; coefficients in Eckstein, Topics Appl. Phys. 110 (2007).
struct EcksteinLaw {
    double lambda = 0, q = 0, mu = 0, eps_per_ev = 0, threshold_ev = 0;
};
/// The same yield at every energy (film removal efficiencies, tests).
struct ConstantLaw {
    double value = 0;
};
using EnergyLaw =
    std::variant<SquareRootLaw, YamamuraTawaraLaw, BohdanskyLaw, EcksteinLaw, ConstantLaw>;

/// 1 at every angle.
struct FlatAngle {};
/// 1 up to `plateau`, then cos(theta) / cos(plateau): 0 at grazing.
struct PlateauCosine {
    double plateau_deg = 45;
};
/// 1 up to `plateau`, then linear in theta to 0 at 90 deg.
struct PlateauLinear {
    double plateau_deg = 60;
};
/// x^f exp(-S (x - 1)), x = 1/cos(theta), S = f cos(theta_opt): peak at theta_opt, 0 at grazing.
/// Yamamura, Radiat. Eff. 80, 57 (1984).
struct YamamuraAngle {
    double f = 2;
    double optimum_deg = 65;
};
using AngleLaw = std::variant<FlatAngle, PlateauCosine, PlateauLinear, YamamuraAngle>;

/// Units removed per ion at energy [eV] and cosine of the angle of incidence (0 below threshold and
/// at grazing incidence). Angular factors are per ion: the flux cosine is not in them.
struct YieldFunction {
    EnergyLaw energy;
    AngleLaw angle;
    double scale = 1;
    double operator()(double energy_ev, double cos_incidence) const;
};

double energy_yield(const EnergyLaw&, double energy_ev);
double angle_factor(const AngleLaw&, double cos_incidence);

} // namespace rille::fluxes
