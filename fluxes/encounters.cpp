// SPDX-License-Identifier: Apache-2.0
#include "fluxes/encounters.hpp"

#include "fluxes/cross_sections.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double two_pi = 6.28318530717958647692;
constexpr double ev_per_kelvin = 8.617333262e-5;
constexpr int lowest_octave = -8, highest_octave = 15; // 4 meV to 33 keV

using Vector = std::array<double, 3>; // the normal comes last

Vector thermal_velocity(double sigma, Draws& draws) {
    if (!(sigma > 0)) return {0, 0, 0};
    const auto a = draws.pair(), b = draws.pair();
    const double first = sigma * std::sqrt(-2 * std::log1p(-a[0]));
    const double second = sigma * std::sqrt(-2 * std::log1p(-b[0]));
    return {first * std::cos(two_pi * a[1]), first * std::sin(two_pi * a[1]),
            second * std::cos(two_pi * b[1])};
}

double squared(const Vector& v) {
    return v[0] * v[0] + v[1] * v[1] + v[2] * v[2];
}

Encounters::Velocity velocity(const Vector& v) {
    return {v[2], std::hypot(v[0], v[1])};
}

} // namespace

Encounters::Encounters(const SheathIon& ion, const SheathField& field)
    : mean_voltage_(field.mean_voltage()) {
    if (!(std::isfinite(ion.gas_temperature_k) && ion.gas_temperature_k >= 0))
        throw std::invalid_argument("the temperature of the gas must not be negative");
    for (const CollisionProcess& process : ion.collisions) {
        check_process(process);
        const double ratio = process.gas_mass_amu / ion.mass_amu;
        if (process.kind == CollisionProcess::Kind::charge_exchange && std::fabs(ratio - 1) > 0.02)
            throw std::invalid_argument("charge exchange needs a gas of the mass of the ion");
        if (process.gas_density == 0) continue;
        const double per_y = process.gas_density * field.width_nm();
        const double kt = ev_per_kelvin * ion.gas_temperature_k;
        process_.push_back({process.kind, ratio, std::sqrt(0.5 * kt / (mean_voltage_ * ratio)),
                            OctaveTable(lowest_octave, highest_octave, [&](double e) {
                                return per_y * cross_section_nm2(process, e);
                            })});
    }
    if (process_.empty()) return;
    total_ = OctaveTable(lowest_octave, highest_octave, [&](double e) {
        double sum = 0;
        for (const Process& process : process_)
            sum += process.rate(e);
        return sum;
    });
}

const Encounters::Process& Encounters::pick(double energy_ev, double choice) const {
    double left = choice * rate(energy_ev);
    for (const Process& process : process_) {
        left -= process.rate(energy_ev);
        if (left < 0) return process;
    }
    return process_.back();
}

double Encounters::rate_of(CollisionProcess::Kind kind, double energy_ev) const {
    double sum = 0;
    for (const Process& process : process_)
        if (process.kind == kind) sum += process.rate(energy_ev);
    return sum;
}

Encounters::Velocity Encounters::deflected(const Velocity& ion, double choice,
                                           double cosine) const {
    constexpr auto kind = CollisionProcess::Kind::isotropic;
    const double energy_ev = mean_voltage_ * ion.squared();
    double left = choice * rate_of(kind, energy_ev), ratio = 1;
    for (const Process& process : process_) {
        if (process.kind != kind) continue;
        ratio = process.mass_ratio;
        left -= process.rate(energy_ev);
        if (left < 0) break;
    }
    const double ion_part = 1 / (1 + ratio), gas_part = 1 - ion_part;
    const double sine = std::sqrt(std::max(0.0, 1 - cosine * cosine));
    return {ion.along * (ion_part + gas_part * cosine), ion.along * gas_part * sine};
}

Encounters::Outcome Encounters::meet(const Velocity& ion, double choice, Draws& draws) const {
    const Process& process = pick(mean_voltage_ * ion.squared(), choice);
    const Vector gas = thermal_velocity(process.thermal_speed, draws);
    const double thermal_ev = mean_voltage_ * process.mass_ratio * squared(gas);
    if (process.kind == CollisionProcess::Kind::charge_exchange)
        return {true, velocity(gas), thermal_ev, 0};

    // In the frame of the centre of mass only the direction of the relative velocity changes.
    const Vector before = {ion.across, 0, ion.along};
    const double ion_part = 1 / (1 + process.mass_ratio), gas_part = 1 - ion_part;
    const Vector relative = {before[0] - gas[0], before[1] - gas[1], before[2] - gas[2]};
    const double speed = std::sqrt(squared(relative));
    const auto u = draws.pair();
    const double cosine = 1 - 2 * u[0], sine = std::sqrt(std::fmax(0.0, 1 - cosine * cosine));
    const Vector way = {sine * std::cos(two_pi * u[1]), sine * std::sin(two_pi * u[1]), cosine};
    Vector after, recoil;
    for (int i = 0; i < 3; ++i) {
        const double centre = ion_part * before[i] + gas_part * gas[i];
        after[i] = centre + gas_part * speed * way[i];
        recoil[i] = centre - ion_part * speed * way[i];
    }
    return {false, velocity(after), thermal_ev,
            mean_voltage_ * process.mass_ratio * squared(recoil)};
}

} // namespace rille::fluxes
