// SPDX-License-Identifier: Apache-2.0
#include "fluxes/bias.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Mean of exp over a straight line from a to b, both <= 0.
double mean_exp(double a, double b) {
    const double d = b - a;
    return std::fabs(d) < 1e-8 ? std::exp(0.5 * (a + b)) : std::exp(a) * std::expm1(d) / d;
}

/// <exp(V / Te)> over a period, 1 wherever V > 0: electrons do not come faster than at random.
double mean_boltzmann(const Waveform& voltage, double electron_ev) {
    double sum = 0;
    const std::size_t count = voltage.volt.size();
    for (std::size_t i = 0; i < count; ++i) {
        double a = voltage.volt[i] / electron_ev, b = voltage.volt[(i + 1) % count] / electron_ev;
        if (a > b) std::swap(a, b);
        if (a >= 0) {
            sum += 1;
        } else if (b <= 0) {
            sum += mean_exp(a, b);
        } else {
            const double above = b / (b - a);
            sum += above + (1 - above) * mean_exp(a, 0.0);
        }
    }
    return sum / double(count);
}

/// Te ln <exp(V / Te)>.
double log_mean_exp_v(const Waveform& voltage, double electron_ev) {
    const double top = voltage.highest();
    return top + electron_ev * std::log(mean_boltzmann(voltage.raised_by(-top), electron_ev));
}

void check(const BiasCircuit& circuit) {
    require(std::isfinite(circuit.electron_temperature_ev) && circuit.electron_temperature_ev > 0,
            "the electron temperature must be above zero");
    require(std::isfinite(circuit.floating_drop_v) && circuit.floating_drop_v > 0,
            "the floating drop must be above zero");
    require(circuit.wall_over_wafer_area >= 1,
            "the grounded area over the wafer's must be 1 or more");
    require(std::isfinite(circuit.area_exponent) && circuit.area_exponent >= 0,
            "the exponent of the area ratio must not be negative");
}

double share_of_wafer(const BiasCircuit& circuit) {
    if (std::isinf(circuit.wall_over_wafer_area)) return 1;
    const double ratio = mean_voltage_ratio(circuit.wall_over_wafer_area, circuit.area_exponent);
    return ratio / (1 + ratio);
}

Waveform scaled(const Waveform& shape, double factor) {
    Waveform result = shape;
    for (double& v : result.volt)
        v *= factor;
    return result;
}

/// Swing about the mean, largest excursion 1.
Waveform unit_swing(const Waveform& shape) {
    const Waveform centred = shape.raised_by(-shape.mean());
    const double size = std::max(centred.highest(), -centred.lowest());
    require(size > 0, "a steady voltage has no swing: a bias behind a capacitor needs one");
    return scaled(centred, 1 / size);
}

/// The scale at which a rising `value` is met.
template <class Value>
WaferBias meet(const Waveform& shape, double wanted, const BiasCircuit& circuit, Value value) {
    const Waveform unit = unit_swing(shape);
    double low = 0, high = circuit.electron_temperature_ev;
    while (value(bias_from_voltage(scaled(unit, high), circuit)) < wanted) {
        low = high;
        high *= 2;
        require(high < 2e5,
                "no bias voltage below 100 kV gives this self-bias: a waveform or an area ratio "
                "without asymmetry has none");
    }
    for (int i = 0; i < 60 && high - low > 1e-12 * high; ++i) {
        const double middle = 0.5 * (low + high);
        (value(bias_from_voltage(scaled(unit, middle), circuit)) < wanted ? low : high) = middle;
    }
    return bias_from_voltage(scaled(unit, 0.5 * (low + high)), circuit);
}

} // namespace

double zero_current_level_v(const Waveform& electrode, double electron_ev, double floating_drop_v) {
    require(std::isfinite(electron_ev) && electron_ev > 0,
            "the electron temperature must be above zero");
    require(std::isfinite(floating_drop_v) && floating_drop_v > 0,
            "the floating drop must be above zero");
    const Waveform swing = electrode.raised_by(-electrode.mean());
    const double level = floating_drop_v + log_mean_exp_v(swing, electron_ev);
    if (level >= swing.highest()) return level;
    // The wafer would rise above the plasma: electrons saturate there.
    const double wanted = std::exp(-floating_drop_v / electron_ev);
    double low = swing.lowest(), high = swing.highest();
    for (int i = 0; i < 60 && high - low > 1e-12 * high; ++i) {
        const double middle = 0.5 * (low + high);
        (mean_boltzmann(swing.raised_by(-middle), electron_ev) > wanted ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

double mean_voltage_ratio(double wall_over_wafer_area, double exponent) {
    require(wall_over_wafer_area > 0, "an area ratio must be above zero");
    return std::pow(wall_over_wafer_area, exponent);
}

double electrical_asymmetry_v(const Waveform& applied, double sheath_ratio) {
    require(std::isfinite(sheath_ratio) && sheath_ratio >= 0,
            "the ratio of the sheath voltages must not be negative");
    return -(applied.highest() + sheath_ratio * applied.lowest()) / (1 + sheath_ratio);
}

double mean_sheath_from_power_v(double power_w, double delivered_fraction, double area_mm2,
                                double ion_flux) {
    require(std::isfinite(power_w) && power_w >= 0, "a power must not be negative");
    require(delivered_fraction > 0 && delivered_fraction <= 1,
            "the delivered fraction of the power must lie between 0 and 1");
    require(std::isfinite(area_mm2) && area_mm2 > 0, "the electrode area must be above zero");
    require(std::isfinite(ion_flux) && ion_flux > 0, "the ion flux must be above zero");
    return delivered_fraction * power_w / (area_mm2 * 1e12 * ion_flux * 1.602176634e-19);
}

double ion_charging_v_per_s(double ion_flux, double capacitance_f_per_m2) {
    require(std::isfinite(ion_flux) && ion_flux >= 0, "an ion flux must not be negative");
    require(std::isfinite(capacitance_f_per_m2) && capacitance_f_per_m2 > 0,
            "a capacitance must be above zero");
    return ion_flux * 1e18 * 1.602176634e-19 / capacitance_f_per_m2;
}

WaferBias bias_from_voltage(const Waveform& applied, const BiasCircuit& circuit) {
    check(circuit);
    WaferBias bias;
    bias.wafer_share = share_of_wafer(circuit);
    bias.applied = applied.raised_by(-applied.mean());
    const double te = circuit.electron_temperature_ev, drop = circuit.floating_drop_v;
    const Waveform at_wafer = scaled(bias.applied, bias.wafer_share);
    // Against the grounded electrode the plasma swings the other way round.
    const Waveform at_wall = scaled(bias.applied, bias.wafer_share - 1);
    // Where the electrode would stand above the plasma, the plasma goes with it.
    const auto sheath = [&](const Waveform& electrode) {
        const double level = zero_current_level_v(electrode, te, drop);
        Waveform voltage = scaled(electrode, -1).raised_by(level);
        for (double& v : voltage.volt)
            v = std::max(v, 0.0);
        return voltage;
    };
    bias.sheath = sheath(at_wafer);
    bias.mean_sheath_v = bias.sheath.mean();
    bias.self_bias_v = sheath(at_wall).mean() - bias.mean_sheath_v;
    bias.always_positive = bias.sheath.lowest() > 0;
    return bias;
}

WaferBias bias_from_mean_sheath(const Waveform& shape, double mean_sheath_v,
                                const BiasCircuit& circuit) {
    require(std::isfinite(mean_sheath_v) && mean_sheath_v >= circuit.floating_drop_v,
            "the mean sheath voltage must be at least the floating drop");
    return meet(shape, mean_sheath_v, circuit, [](const WaferBias& b) { return b.mean_sheath_v; });
}

WaferBias bias_from_self_bias(const Waveform& shape, double self_bias_v,
                              const BiasCircuit& circuit) {
    require(std::isfinite(self_bias_v) && self_bias_v <= 0,
            "the self-bias of a wafer is negative, as measured against ground");
    return meet(shape, -self_bias_v, circuit, [](const WaferBias& b) { return -b.self_bias_v; });
}

} // namespace rille::fluxes
