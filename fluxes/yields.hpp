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
/// In proportion to the energy, without threshold: with a flat angular factor it counts the energy
/// that ions bring.
struct LinearLaw {
    double per_ev = 0; ///< [1/eV]
};
using EnergyLaw = std::variant<SquareRootLaw, YamamuraTawaraLaw, BohdanskyLaw, EcksteinLaw,
                               ConstantLaw, LinearLaw>;

/// 1 at every angle.
struct FlatAngle {};
/// 1 up to `plateau`, then cos(theta) / cos(plateau): 0 at grazing.
struct PlateauCosine {
    explicit PlateauCosine(double plateau_deg = 45);
    double plateau_deg;
    double edge; ///< its cosine
};
/// 1 up to `plateau`, then linear in theta to 0 at 90 deg.
struct PlateauLinear {
    double plateau_deg = 60;
};
/// x^f exp(-S (x - 1)), x = 1/cos(theta), S = f cos(theta_opt): peak at theta_opt, 0 at grazing.
/// Yamamura, Radiat. Eff. 80, 57 (1984).
struct YamamuraAngle {
    explicit YamamuraAngle(double f = 2, double optimum_deg = 65);
    double f;
    double optimum_deg;
    double slope; ///< S
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

/// The yield of a molecular ion whose atoms share its energy: n(atoms) times the yield of one atom
/// at energy / atoms. Collapse of Cl_x+ and SiCl_x+ yields on energy per halogen: Nakazaki et al.,
/// Jpn. J. Appl. Phys. 53, 056201 (2014) [abstract read]. atoms >= 1. Throws InternalError for the
/// Yamamura-Tawara law, whose projectile is an element.
YieldFunction shared_by_atoms(const YieldFunction&, double atoms);

/// Two bodies of the collision theories: atomic numbers, masses [amu], surface binding energy [eV].
struct CollisionPair {
    double z1 = 0, m1 = 0; ///< projectile
    double z2 = 0, m2 = 0; ///< target
    double us_ev = 0;
};
/// Threshold and Thomas-Fermi energy of the Bohdansky law [from memory]; q is fitted per pair.
BohdanskyLaw bohdansky_law(const CollisionPair&, double q);
/// Angular law of a heavy ion at one energy: Yamamura, Radiat. Eff. 80, 57 (1984), with the Sigmund
/// exponent (5/3 by theory, 1.71 in some tables). Atom density of the target in nm^-3. f, which
/// diverges at the threshold, is kept <= 15.
YamamuraAngle yamamura_angle(const CollisionPair&, double atom_density, double energy_ev,
                             double sigmund_exponent = 5.0 / 3.0);

/// Intermediate quantities of the Yamamura-Tawara law, for checks against printed values.
struct YamamuraTawaraTerms {
    double gamma = 0, alpha = 0, eps = 0, ke = 0, sn = 0, stopping_ev_a2 = 0, big_gamma = 0;
    double threshold_ev = 0;
};
YamamuraTawaraTerms yamamura_tawara_terms(const YamamuraTawaraLaw&, double energy_ev);

} // namespace rille::fluxes
