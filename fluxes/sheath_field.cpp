// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_field.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double elementary_charge = 1.602176634e-19;
constexpr double atomic_mass = 1.66053906660e-27;

/// Fourth-order steps of these lengths leave mean energies within 1e-4 and widths within 1e-3. A
/// voltage with flanks needs more of them than its steepness alone would say, but each flank is met
/// at any place in a step, so that its errors cancel between ions.
constexpr double steps_per_fall = 8, steps_per_period = 8, steps_per_steep_period = 14;
constexpr double most_for_flanks = 128;
constexpr double flank = 0.5; ///< turn per sample [rad] that no resolved sine makes

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Steps that resolve a period. The slope over the swing is the frequency of a sine; the curvature
/// over the slope is that of the fastest part of several, but knows no bounds on flanks.
double steps_in_period(const std::vector<double>& volt, double mean) {
    const std::size_t n = volt.size();
    double swing = 0, slope = 0, curvature = 0;
    for (std::size_t i = 0; i < n; ++i) {
        const double here = volt[i], next = volt[(i + 1) % n], last = volt[(i + n - 1) % n];
        swing += (here - mean) * (here - mean);
        slope += (next - here) * (next - here);
        curvature += (next - 2 * here + last) * (next - 2 * here + last);
    }
    if (!(swing > 0 && slope > 0)) return steps_per_period;
    const double turns = double(n) / (2 * pi), bend = std::sqrt(curvature / slope);
    const double steep = turns * steps_per_steep_period * std::sqrt(slope / swing);
    const double wanted = bend > flank ? std::min(steep, most_for_flanks)
                                       : std::min(steep, turns * steps_per_period * bend);
    return std::max(steps_per_period, wanted);
}

} // namespace

SheathField::SheathField(const Sheath& sheath, double mass_amu) {
    const std::vector<double>& volt = sheath.voltage.volt;
    require(!volt.empty(), "a sheath needs a voltage");
    for (const double v : volt)
        require(std::isfinite(v) && v >= 0, "the voltage of a sheath must not be negative");
    mean_v_ = sheath.voltage.mean();
    require(mean_v_ > 0, "the mean voltage of a sheath must be above zero");
    require(std::isfinite(sheath.thickness_nm) && sheath.thickness_nm > 0,
            "the thickness of a sheath must be above zero");
    require(std::isfinite(mass_amu) && mass_amu > 0, "the mass of an ion must be above zero");
    require(sheath.profile_power >= 1 && sheath.profile_power <= 4,
            "the potential of a sheath must rise with a power of 1 to 4");
    steady_ = volt.size() == 1;
    require(steady_ || (std::isfinite(sheath.voltage.period_s) && sheath.voltage.period_s > 0),
            "a voltage that changes needs a period");
    moving_ = sheath.edge == SheathEdge::moving && !steady_;
    power_ = sheath.edge == SheathEdge::moving ? 2 : sheath.profile_power;

    // Matrix width of each moment's voltage, s ~ sqrt(V); the pull is that of a uniform charge.
    const double widest = moving_ ? std::sqrt(sheath.voltage.highest() / mean_v_) : 1.0;
    width_nm_ = sheath.thickness_nm * widest;
    strength_ = widest * widest;
    for (const double v : volt)
        swing_.push_back(moving_ ? 1 - std::sqrt(v / mean_v_) / widest
                                 : 0.5 * power_ * v / mean_v_);
    swing_.push_back(swing_.front());
    if (!moving_) shape_ = OctaveTable(-30, 0, [&](double y) { return std::pow(y, power_ - 1); });

    longest_step_ = std::sqrt(mean_v_ / sheath.voltage.highest()) / steps_per_fall;
    if (steady_) return;
    const double full_speed =
        1e9 * std::sqrt(2 * elementary_charge * mean_v_ / (atomic_mass * mass_amu)); // [nm/s]
    period_ = sheath.voltage.period_s * full_speed / width_nm_;
    phase_per_time_ = 1 / period_;
    samples_ = static_cast<double>(volt.size());
    const double per_period = std::min(steps_in_period(volt, mean_v_), 4 * samples_);
    longest_step_ = std::min(longest_step_, period_ / per_period);
}

double SheathField::steady_gain_ev(double y) const {
    return mean_v_ * std::pow(y, power_);
}

double SheathField::steady_place(double gain_ev) const {
    return std::pow(std::max(gain_ev, 0.0) / mean_v_, 1 / power_);
}

double SheathField::entry_gain_ev(double time, double y) const {
    if (moving_) return 0;
    return 2 * mean_v_ / power_ * swing(time) * std::pow(y, power_);
}

} // namespace rille::fluxes
