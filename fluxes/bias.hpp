// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/waveform.hpp"

#include <limits>

namespace rille::fluxes {

/// Voltage that a blocking capacitor settles at: the electrode draws no net charge over a period.
/// Level V0 of the sheath voltage V0 - V_el(t) of an electrode that swings by V_el about its own
/// mean: V0 = floating drop + Te ln <exp(V_el / Te)>, Maxwellian electrons, constant ion flux,
/// electron transit short against the period (derived; for one sine the average is I0, Garscadden &
/// Emeleus 1962, from memory). At large swings, where this would put the wafer above the plasma for
/// a moment, electrons come at their random flux there (derived). Exact for straight lines between
/// the samples; does not overflow.
double zero_current_level_v(const Waveform& electrode, double electron_ev, double floating_drop_v);

/// Mean voltage of the smaller (wafer) sheath over that of the larger one: (A_wall / A_wafer)^q.
/// q = 4: Koenig & Maissel 1970; q = 2.5: collisional, Lieberman 1989; measured 1 to 2.5 (from
/// memory).
double mean_voltage_ratio(double wall_over_wafer_area, double exponent);

/// Dc bias by the extremes of the applied voltage, -(max + eps min) / (1 + eps), with eps the
/// largest voltage of the grounded sheath over that of the powered one (Heil 2008; Czarnetzki 2011,
/// from memory).
double electrical_asymmetry_v(const Waveform& applied, double sheath_ratio);

/// Mean sheath voltage from the power that ions carry to the wafer: delivered * P / (A e Gamma).
/// area [mm^2], flux [nm^-2 s^-1].
double mean_sheath_from_power_v(double power_w, double delivered_fraction, double area_mm2,
                                double ion_flux);

/// By how much the ions raise an insulated wafer's surface [V/s], J / C with the capacitance per
/// area of film, chuck and blocking capacitor in series [F/m^2]; a ramp as steep downwards holds
/// the sheath voltage (Wang & Wendt 2000, from memory). flux [nm^-2 s^-1].
double ion_charging_v_per_s(double ion_flux, double capacitance_f_per_m2);

/// Wafer electrode behind a blocking capacitor.
struct BiasCircuit {
    double electron_temperature_ev = 3;
    double floating_drop_v = 0; ///< edge to a floating wall
    /// Area of the other, grounded electrode over the wafer's; infinite: the plasma does not swing.
    double wall_over_wafer_area = std::numeric_limits<double>::infinity();
    double area_exponent = 1;
};

/// What a bias makes of the sheath above the wafer.
struct WaferBias {
    Waveform applied; ///< at the electrode, without its dc part
    Waveform sheath;  ///< plasma edge minus wafer
    double mean_sheath_v = 0;
    double self_bias_v = 0; ///< dc voltage of the electrode against the grounded one, mostly < 0
    double wafer_share = 1; ///< of the swing that falls across the wafer's sheath
    /// The plasma stays above the wafer at all phases; else the sheath was held at 0 V there.
    bool always_positive = true;
};

/// The swing divides between the two sheaths as their mean voltages do; each sheath draws no net
/// charge. `applied` may have a mean: it changes nothing behind a capacitor.
WaferBias bias_from_voltage(const Waveform& applied, const BiasCircuit&);
/// The same shape, scaled so that the mean sheath voltage, or the self-bias, is the one given.
/// Throws std::invalid_argument where no amplitude gives it.
WaferBias bias_from_mean_sheath(const Waveform& shape, double mean_sheath_v, const BiasCircuit&);
WaferBias bias_from_self_bias(const Waveform& shape, double self_bias_v, const BiasCircuit&);

} // namespace rille::fluxes
