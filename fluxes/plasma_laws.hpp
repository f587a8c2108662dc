// SPDX-License-Identifier: Apache-2.0
// Laws of a plasma in front of a wall, one number in, one number out. Units: nm, s, eV, V, K, amu,
// Pa; densities nm^-3, fluxes nm^-2 s^-1, speeds nm/s. Bad input: std::invalid_argument.
#pragma once

namespace rille::fluxes {

constexpr double electron_mass_amu = 5.48579909065e-4;
/// Vacuum permittivity in elementary charges per V and nm (CODATA 2018).
constexpr double permittivity = 8.8541878128e-12 / 1.602176634e-19 * 1e-9;
/// Boltzmann constant in eV per K.
constexpr double ev_per_kelvin = 1.380649e-23 / 1.602176634e-19;

/// Speed of an ion that has fallen through `energy_ev`, sqrt(2 E / M).
double speed_of(double energy_ev, double mass_amu);
/// Mean speed of a Maxwellian, sqrt(8 T / (pi M)) (kinetic theory).
double thermal_speed(double temperature_ev, double mass_amu);
/// Random one-way flux n v / 4 (kinetic theory).
double thermal_flux(double density, double mean_speed);
/// Ideal gas.
double gas_density(double pressure_pa, double temperature_k);
/// Flux of a gas of this partial pressure on a wall.
double gas_flux(double partial_pressure_pa, double temperature_k, double mass_amu);

/// Speed of cold ions at the edge of a sheath, sqrt(Te / M) (Bohm 1949).
double bohm_speed(double electron_ev, double mass_amu);
/// By which negative ions slow the positive ones at the edge: sqrt((1 + a) / (1 + g a)) with
/// a = n- / ne at the edge and g = Te / T- (Boyd & Thompson 1959; Braithwaite & Allen 1988; from
/// memory).
double electronegative_factor(double edge_ratio, double temperature_ratio);
/// sqrt(eps0 Te / (e n)); sheath laws want the density at the edge.
double debye_length_nm(double electron_ev, double density);

/// Edge over bulk density of a presheath without collisions: exp(-1/2), a drop of Te / 2.
double collisionless_edge_ratio();
/// Edge over centre density between plates `gap_nm` apart: 0.86 / sqrt(3 + gap / (2 lambda)), low
/// to moderate pressure (Godyak 1986, from memory).
double plane_edge_ratio(double gap_nm, double mean_free_path_nm);

/// Drop from the sheath edge to a wall at which as many Maxwellian electrons as ions arrive:
/// Te ln(ne v / (4 Gamma)) (flux balance, derived). Any number of ion species: their total flux.
double floating_drop_v(double electron_ev, double edge_electrons, double ion_flux);

/// Thickness of a sheath of uniform ion density: lD sqrt(2 V / Te).
double matrix_thickness_nm(double drop_v, double electron_ev, double edge_density);
/// Collisionless ions that enter at the Bohm speed: (sqrt 2 / 3) lD (2 V / Te)^(3/4) (Child 1911,
/// Langmuir 1913; independent of the ion's mass).
double child_thickness_nm(double drop_v, double electron_ev, double edge_density);
/// Ion flux that a gap of this width carries: (4/9) eps0 sqrt(2 e / M) V^(3/2) / (e s^2).
double child_flux(double drop_v, double thickness_nm, double mass_amu);
/// Ions that drift between charge exchanges of a constant mean free path:
/// s^(5/2) = 1.43444 lD^2 sqrt(2 lambda / pi) (V / Te)^(3/2) (from memory, re-derived).
double collisional_thickness_nm(double drop_v, double electron_ev, double edge_density,
                                double mean_free_path_nm);

/// Field at the wall [V/nm] by the first integral of Poisson's equation with Boltzmann electrons
/// and ions that enter at the Bohm speed:
/// (lD E / Te)^2 = 2 [sqrt(1 + 2 V / Te) - 1 + exp(-V / Te) - 1].
double exact_wall_field(double drop_v, double electron_ev, double edge_density);
/// Distance between the place where the drop is `from_v` (> 0: the edge itself is infinitely far
/// away) and the wall, by the same integral.
double exact_thickness_nm(double drop_v, double electron_ev, double edge_density, double from_v);
/// Field at the wall by Child's law, 4 V / (3 s).
double child_wall_field(double drop_v, double electron_ev, double edge_density);

} // namespace rille::fluxes
