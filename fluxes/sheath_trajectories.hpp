// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath.hpp"

#include <array>
#include <cstdint>
#include <vector>

namespace rille::fluxes {

/// A particle that reached the wafer.
struct Arrival {
    double energy_ev = 0;
    double tangent = 0; ///< of the angle from the wafer normal
    float phase = 0;    ///< of the period at arrival, [0, 1)
};

struct TrajectorySampling {
    int ions = 100000; ///< rounded up to a multiple of 8 batches
    std::uint64_t seed = 1;
};

/// What came of the ions that entered a sheath: one ion each, and the fast neutrals that they left
/// behind in charge exchange on their way. Fast neutrals fly straight to the wafer: collisions of
/// their own are left out, so above about one mean free path they are too fast and too well aimed.
/// Those that an ion left right after its birth are hardly fast; they are among them.
/// Ions keep the order of their entry, an eighth of them per batch; batches are independent.
struct Arrivals {
    std::vector<Arrival> ions;
    std::vector<Arrival> fast_neutrals;
    double exchanges_per_ion = 0;
    /// Largest |energy in - energy out| of one ion with its fast neutrals, over the energy in;
    /// counted without the thermal energy of the gas. Steady voltages only.
    double energy_defect = 0;
};

/// Follows ions through the sheath, in chunks that do not depend on the number of threads; entry
/// phases and collisions by a scrambled low-discrepancy sequence. Same sampling, same bits.
///
/// Ions enter at the widest edge, evenly over the period, with the energy of the presheath and a
/// flux-weighted Maxwellian of `transverse_ev` on top, along and across. A fixed edge has the field
/// m V(t) / s (x / s)^(m - 1); a moving one that of uniform ions, 2 mean(V) / s^2 times the depth
/// below the edge s sqrt(V(t) / mean(V)). Collision rates follow the ion's energy against gas at
/// rest; the gas's own motion enters the kinematics. What a collision throws back through the edge
/// comes back as it left.
/// Steps of fourth order, ending on the wafer; in a steady field energies follow from the places.
/// Mean energies are good to 1e-4, widths to 1e-3.
/// Throws std::invalid_argument on a sheath, an ion or a process that cannot be, on charge exchange
/// with a gas of another mass than the ion's, and on ions of no energy in a changing sheath.
Arrivals follow_ions(const Sheath&, const SheathIon&, const TrajectorySampling&);

/// Joint histogram of arrivals, weight[energy][angle]; without edges there are none.
struct ArrivalBins {
    std::vector<double> energy_edges_ev, angle_edges_deg;
    std::vector<std::vector<double>> weight;

    IonDistribution distribution() const;
};
/// The bins are halved where they blur the most, so that narrow beams and wide tails are both
/// resolved. Each arrival counts by its weight, above zero; all alike without weights. Throws
/// std::invalid_argument on no arrivals or such that cannot be.
ArrivalBins bins_of(const std::vector<Arrival>&, const std::vector<double>& weight = {},
                    int energy_bins = 96, int angle_bins = 48);
IonDistribution distribution_of(const std::vector<Arrival>&);

} // namespace rille::fluxes
