// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath.hpp"

namespace rille::fluxes {

/// The voltage that ions of transit time `transit_s` answer to: each Fourier component of the
/// sheath voltage weakened by [1 + (omega tau_i / 4)^3]^(-1/3), fitted to trajectories in a Child
/// sheath of fixed width (6 %); the mean carries a tabulated correction for the gain of ions in the
/// oscillating field.
Waveform damped_voltage(const Waveform& sheath_voltage, double transit_s);

/// Closed form for a sheath without collisions: every phase of entry weighs the same, so the
/// energies follow the damped voltage over one period; the spread in angle is thermal.
IonDistribution damped_arrival(const Sheath&, const SheathIon&);

} // namespace rille::fluxes
