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
/// behind in charge exchange on their way.
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
/// Throws std::invalid_argument on a sheath that cannot be.
Arrivals follow_ions(const Sheath&, const SheathIon&, const TrajectorySampling&);

/// Joint distribution of energy and angle: bins by quantiles, so that narrow beams and wide tails
/// are both resolved.
IonDistribution distribution_of(const std::vector<Arrival>&);

} // namespace rille::fluxes
