// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath.hpp"

namespace rille::fluxes {

/// How a sheath answers one frequency: amplitude of the energy over that of the voltage,
/// [1 + (omega tau_i / c)^3]^(-1/3), exact at both ends: c = 3 m for a fixed edge with a potential
/// ~ x^m (4 for Child's law: within 6 % of trajectories), 3 for a moving edge. tau_i = 3 s / v0.
/// Form of Wu, Lieberman, Verboncoeur (2007, from memory); constants fitted here.
double damping(double omega_tau, double limit = 4);
double damping_limit(const Sheath&);

/// The voltage that ions of transit time `transit_s` answer to: each Fourier component weakened by
/// `damping`, the mean kept.
Waveform damped_voltage(const Waveform& sheath_voltage, double transit_s, double limit = 4);

/// The same by one time constant for all components, dVd/dt = (Vs - Vd) / relaxation_s, in its
/// periodic state; exact for the straight lines between samples. Widths agree with trajectories at
/// both ends for relaxation_s = transit / 4 (Child's law).
Waveform relaxed_voltage(const Waveform& sheath_voltage, double relaxation_s);

/// Mean energy of ions at the wafer over mean voltage plus entry energy, minus 1, in a swinging
/// sheath: ions enter evenly in time, yet more of them arrive with the energy of high voltages.
/// `entry`: entry energy over mean voltage. From 48 trajectories for one sine, else 256, by a
/// fourth-order Runge-Kutta rule, to 2e-3. The voltage must not be negative; `fastest_omega_tau` is
/// that of its fastest part worth following.
double mean_gain(const Waveform&, double transit_s, double fastest_omega_tau, double entry,
                 double profile_power = 4 / 3., SheathEdge edge = SheathEdge::fixed);
/// The same for a sine of amplitude `swing` (at most 1) times the mean voltage.
double mean_gain(double omega_tau, double swing, double entry, double profile_power = 4 / 3.,
                 SheathEdge edge = SheathEdge::fixed);

/// Share of the period that a voltage spends between the edges (one fewer than edges), straight
/// lines between samples.
std::vector<double> time_shares(const Waveform&, const std::vector<double>& edges);

/// Closed form for ions without collisions: the normal energy is the damped voltage plus half the
/// electron temperature plus the mean thermal energy along the normal, that of `transverse_ev`; the
/// spread in angle is thermal. In a steady sheath the thermal fall, exact. `gain` is a factor on
/// the mean energy, for those ions that come through where collisions take others. Beyond the
/// damping it carries what trajectories show: the mean of `mean_gain`, brought in by a power of the
/// energy on the arrivals, and small corrections of the middle (up to 9 % of the mean voltage) and
/// the width (up to 6 %), tabulated over omega tau_i and added up over the Fourier components.
/// Against trajectories in a Child sheath: mean energy within 1 %, width between 5 and 95 % of the
/// ions within 10 %, median angle within 5 %. Not so for other fields: widths up to 13 % off with
/// x^2, and with a moving edge up to a third too wide near omega tau_i = 2, where the ions bunch
/// most; the mean still holds. Of pulses as short as the transit time the low tail is only told by
/// a factor. Throws std::invalid_argument on a sheath that cannot be.
IonDistribution damped_arrival(const Sheath&, const SheathIon&, double gain = 1);

} // namespace rille::fluxes
