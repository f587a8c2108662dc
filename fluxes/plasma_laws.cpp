// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plasma_laws.hpp"

#include <boost/math/quadrature/gauss_kronrod.hpp>

#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double nm2_per_s2 = 1.602176634e-19 / 1.66053906660e-27 * 1e18; ///< of 1 eV per amu

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}
void require_positive(double value, const char* message) {
    require(std::isfinite(value) && value > 0, message);
}
void require_not_negative(double value, const char* message) {
    require(std::isfinite(value) && value >= 0, message);
}

constexpr const char* bad_mass = "a mass must be above zero";
constexpr const char* bad_density = "a density must be above zero";
constexpr const char* bad_electrons = "the electron temperature must be above zero";
constexpr const char* bad_drop = "the voltage across a sheath must not be negative";
constexpr const char* bad_path = "a mean free path must be above zero";

/// (lD E / Te)^2 at a drop of u electron temperatures; its series where digits would cancel.
double field_squared(double u) {
    if (u < 1e-3) return 2 * u * u * u * (1 / 3. - 7 / 12. * u);
    return 2 * (std::sqrt(1 + 2 * u) - 1 + std::expm1(-u));
}

} // namespace

double speed_of(double energy_ev, double mass_amu) {
    require_not_negative(energy_ev, "an energy must not be negative");
    require_positive(mass_amu, bad_mass);
    return std::sqrt(2 * energy_ev * nm2_per_s2 / mass_amu);
}

double thermal_speed(double temperature_ev, double mass_amu) {
    require_not_negative(temperature_ev, "a temperature must not be negative");
    require_positive(mass_amu, bad_mass);
    return std::sqrt(8 * temperature_ev * nm2_per_s2 / (pi * mass_amu));
}

double thermal_flux(double density, double mean_speed) {
    require_not_negative(density, "a density must not be negative");
    return 0.25 * density * mean_speed;
}

double gas_density(double pressure_pa, double temperature_k) {
    require_not_negative(pressure_pa, "a pressure must not be negative");
    require_positive(temperature_k, "a gas temperature must be above zero");
    return pressure_pa / (1.380649e-23 * temperature_k) * 1e-27;
}

double gas_flux(double partial_pressure_pa, double temperature_k, double mass_amu) {
    return thermal_flux(gas_density(partial_pressure_pa, temperature_k),
                        thermal_speed(ev_per_kelvin * temperature_k, mass_amu));
}

double bohm_speed(double electron_ev, double mass_amu) {
    require_positive(electron_ev, bad_electrons);
    require_positive(mass_amu, bad_mass);
    return std::sqrt(electron_ev * nm2_per_s2 / mass_amu);
}

double electronegative_factor(double edge_ratio, double temperature_ratio) {
    require_not_negative(edge_ratio, "the density ratio of negative ions must not be negative");
    require(std::isfinite(temperature_ratio) && temperature_ratio >= 1,
            "electrons are at least as hot as the negative ions: Te / T- of 1 or more");
    return std::sqrt((1 + edge_ratio) / (1 + temperature_ratio * edge_ratio));
}

double debye_length_nm(double electron_ev, double density) {
    require_positive(electron_ev, bad_electrons);
    require_positive(density, bad_density);
    return std::sqrt(permittivity * electron_ev / density);
}

double collisionless_edge_ratio() {
    return std::exp(-0.5);
}

double plane_edge_ratio(double gap_nm, double mean_free_path_nm) {
    require_positive(gap_nm, "the gap of a discharge must be above zero");
    require_positive(mean_free_path_nm, bad_path);
    return 0.86 / std::sqrt(3 + gap_nm / (2 * mean_free_path_nm));
}

double floating_drop_v(double electron_ev, double edge_electrons, double ion_flux) {
    require_positive(electron_ev, bad_electrons);
    require_positive(edge_electrons, bad_density);
    require_positive(ion_flux, "an ion flux must be above zero");
    const double electrons =
        thermal_flux(edge_electrons, thermal_speed(electron_ev, electron_mass_amu));
    require(electrons > ion_flux, "fewer electrons than ions reach the wall: the ion flux is too "
                                  "large for this electron density");
    return electron_ev * std::log(electrons / ion_flux);
}

double matrix_thickness_nm(double drop_v, double electron_ev, double edge_density) {
    require_not_negative(drop_v, bad_drop);
    return debye_length_nm(electron_ev, edge_density) * std::sqrt(2 * drop_v / electron_ev);
}

double child_thickness_nm(double drop_v, double electron_ev, double edge_density) {
    require_not_negative(drop_v, bad_drop);
    return std::sqrt(2.0) / 3 * debye_length_nm(electron_ev, edge_density) *
           std::pow(2 * drop_v / electron_ev, 0.75);
}

double child_flux(double drop_v, double thickness_nm, double mass_amu) {
    require_not_negative(drop_v, bad_drop);
    require_positive(thickness_nm, "a sheath thickness must be above zero");
    require_positive(mass_amu, bad_mass);
    return 4 / 9. * permittivity * std::sqrt(2 * nm2_per_s2 / mass_amu) * std::pow(drop_v, 1.5) /
           (thickness_nm * thickness_nm);
}

double collisional_thickness_nm(double drop_v, double electron_ev, double edge_density,
                                double mean_free_path_nm) {
    require_not_negative(drop_v, bad_drop);
    require_positive(mean_free_path_nm, bad_path);
    const double debye = debye_length_nm(electron_ev, edge_density);
    // (2/3) (5/3)^(3/2) = 1.43444: drift speed sqrt(2 e lambda E / (pi M)) in Poisson's equation.
    const double factor = 2 / 3. * std::pow(5 / 3., 1.5);
    return std::pow(factor * debye * debye * std::sqrt(2 * mean_free_path_nm / pi) *
                        std::pow(drop_v / electron_ev, 1.5),
                    0.4);
}

double exact_wall_field(double drop_v, double electron_ev, double edge_density) {
    require_not_negative(drop_v, bad_drop);
    return electron_ev / debye_length_nm(electron_ev, edge_density) *
           std::sqrt(field_squared(drop_v / electron_ev));
}

double exact_thickness_nm(double drop_v, double electron_ev, double edge_density, double from_v) {
    require_positive(from_v, "the edge of a sheath is counted from a drop above zero");
    require(std::isfinite(drop_v) && drop_v >= from_v,
            "the drop to the wall must exceed the drop at which the sheath begins");
    const double debye = debye_length_nm(electron_ev, edge_density);
    // In ln u the integrand is smooth over all decades.
    const double integral = boost::math::quadrature::gauss_kronrod<double, 31>::integrate(
        [](double log_u) {
            const double u = std::exp(log_u);
            return u / std::sqrt(field_squared(u));
        },
        std::log(from_v / electron_ev), std::log(drop_v / electron_ev), 10, 1e-10);
    return debye * integral;
}

double child_wall_field(double drop_v, double electron_ev, double edge_density) {
    require_positive(drop_v, "Child's law needs a drop above zero");
    return 4 / 3. * drop_v / child_thickness_nm(drop_v, electron_ev, edge_density);
}

} // namespace rille::fluxes
