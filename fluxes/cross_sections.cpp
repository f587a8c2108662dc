// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>
#include <utility>

namespace rille::fluxes {
namespace {

constexpr double nm2_per_m2 = 1e18;
constexpr double argon_mass_amu = 39.948;
constexpr double lowest_ev = 0.1, highest_ev = 1e4;

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Twenty energies a decade: between them straight lines in the logarithms are within 1e-3 of laws
/// that turn as slowly as these.
std::vector<double> energy_grid() {
    constexpr int per_decade = 20;
    const int count =
        static_cast<int>(std::lround(per_decade * std::log10(highest_ev / lowest_ev)));
    std::vector<double> energy;
    for (int i = 0; i <= count; ++i)
        energy.push_back(lowest_ev * std::pow(10.0, double(i) / per_decade));
    return energy;
}

} // namespace

double PhelpsArgon::momentum_nm2(double energy_ev) const {
    const double e = std::max(energy_ev, lowest_ev);
    return 1.15e-18 * nm2_per_m2 * std::pow(e, -0.1) * std::pow(1 + 0.015 / e, 0.6);
}

double PhelpsArgon::isotropic_nm2(double energy_ev) const {
    const double e = std::max(energy_ev, lowest_ev);
    return nm2_per_m2 *
           (2e-19 / (std::sqrt(e) * (1 + e)) + 3e-19 * e / std::pow(1 + e / 3, exponent));
}

double PhelpsArgon::backward_nm2(double energy_ev) const {
    return 0.5 * (momentum_nm2(energy_ev) - isotropic_nm2(energy_ev));
}

std::vector<CollisionProcess> argon_in_argon(double gas_density, const PhelpsArgon& law) {
    using Kind = CollisionProcess::Kind;
    CollisionProcess exchange{Kind::charge_exchange, "Ar",          argon_mass_amu,
                              gas_density,           energy_grid(), {}};
    CollisionProcess elastic = exchange;
    elastic.kind = Kind::isotropic;
    for (const double e : exchange.energy_ev) {
        exchange.cross_section_nm2.push_back(law.backward_nm2(e));
        elastic.cross_section_nm2.push_back(law.isotropic_nm2(e));
    }
    check_process(exchange);
    check_process(elastic);
    return {std::move(exchange), std::move(elastic)};
}

double capture_nm2(double energy_ev, double ion_mass_amu, double gas_mass_amu,
                   double polarisability_nm3) {
    require(energy_ev > 0 && ion_mass_amu > 0 && gas_mass_amu > 0 && polarisability_nm3 > 0,
            "capture needs an energy, masses and a polarisability above zero");
    constexpr double pi = 3.14159265358979323846;
    constexpr double elementary_charge = 1.602176634e-19, epsilon_0 = 8.8541878128e-12;
    // k / v with mu = m M / (m + M) and v = sqrt(2 e E / m): the mass unit drops out.
    const double mass_ratio = (ion_mass_amu + gas_mass_amu) / gas_mass_amu;
    const double per_energy = elementary_charge / (2 * epsilon_0); // [V m]
    const double area_m2 =
        std::sqrt(pi * polarisability_nm3 * 1e-27 * per_energy * mass_ratio / energy_ev);
    return area_m2 * nm2_per_m2;
}

CollisionProcess capture_process(CollisionProcess::Kind kind, double ion_mass_amu, std::string gas,
                                 double gas_mass_amu, double gas_density,
                                 double polarisability_nm3) {
    CollisionProcess process{kind, std::move(gas), gas_mass_amu, gas_density, energy_grid(), {}};
    for (const double e : process.energy_ev)
        process.cross_section_nm2.push_back(
            capture_nm2(e, ion_mass_amu, gas_mass_amu, polarisability_nm3));
    check_process(process);
    return process;
}

CollisionProcess constant_process(CollisionProcess::Kind kind, std::string gas, double gas_mass_amu,
                                  double gas_density, double cross_section_nm2) {
    CollisionProcess process{kind,        std::move(gas), gas_mass_amu,
                             gas_density, {1.0},          {cross_section_nm2}};
    check_process(process);
    return process;
}

double cross_section_nm2(const CollisionProcess& process, double energy_ev) {
    const std::vector<double>& e = process.energy_ev;
    const std::vector<double>& q = process.cross_section_nm2;
    if (!(energy_ev > e.front())) return q.front();
    if (energy_ev >= e.back()) return q.back();
    const std::size_t i = std::upper_bound(e.begin(), e.end(), energy_ev) - e.begin();
    const double part = std::log(energy_ev / e[i - 1]) / std::log(e[i] / e[i - 1]);
    if (!(q[i - 1] > 0 && q[i] > 0)) return q[i - 1] + part * (q[i] - q[i - 1]);
    return q[i - 1] * std::pow(q[i] / q[i - 1], part);
}

void check_process(const CollisionProcess& process) {
    const std::vector<double>& e = process.energy_ev;
    require(!e.empty() && e.size() == process.cross_section_nm2.size(),
            "a collision needs one cross section per energy");
    for (std::size_t i = 0; i < e.size(); ++i) {
        require(std::isfinite(e[i]) && e[i] > (i > 0 ? e[i - 1] : 0.0),
                "energies of cross sections must increase from above zero");
        const double q = process.cross_section_nm2[i];
        require(std::isfinite(q) && q >= 0, "cross sections must be finite and not negative");
    }
    require(std::isfinite(process.gas_density) && process.gas_density >= 0,
            "the density of a gas must not be negative");
    require(std::isfinite(process.gas_mass_amu) && process.gas_mass_amu > 0,
            "the mass of a gas must be above zero");
}

} // namespace rille::fluxes
