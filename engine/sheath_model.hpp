// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/plasma.hpp"

#include <cstdint>
#include <string>
#include <vector>

namespace rille::engine {

/// The sheath while one state of the bias lasts.
struct SheathPhase {
    std::string name; ///< "on", "off"; "" if the bias is not pulsed
    double share = 1; ///< of the time
    fluxes::Sheath sheath;
    std::string width_law; ///< "Child's law", "collisional Child law", "matrix"
    double debye_nm = 0;
    double ion_flux = 0;   ///< all ions [nm^-2 s^-1]
    double floating_v = 0; ///< fall to a floating wall, from the sheath edge
};

/// One ion species at the wafer, averaged over the phases by their fluxes.
struct IonAtWafer {
    std::string name;
    double mass_amu = 0;
    double flux = 0;              ///< of the ions [nm^-2 s^-1]
    double fast_neutral_flux = 0; ///< born of them in charge exchange [nm^-2 s^-1]
    std::string way;              ///< "table", "free fall", "closed form", "trajectories"
    double transit_s = 0;         ///< through the mean sheath of the first phase; 0 for a table
    double collisionality = 0;    ///< thickness over mean free path; 0 where not known
    std::vector<fluxes::IonDistribution> ions;          ///< one
    std::vector<fluxes::IonDistribution> fast_neutrals; ///< one, or none
    /// One: both together, as surfaces feel them. A fast neutral hits like the ion that it was,
    /// which is neutral itself by the time it touches the surface (common practice, no source).
    std::vector<fluxes::IonDistribution> arriving;
};

/// What comes of a plasma at the wafer.
struct SheathResult {
    std::vector<SheathPhase> phases; ///< none where tables say everything
    double plasma_potential_v = 0;   ///< bulk of the plasma over a floating wall
    std::vector<IonAtWafer> ions;
    std::vector<std::string> warnings; ///< where the model leaves its range, in plain words
    std::vector<std::string> notes;    ///< what limits it less than that
};

/// Takes a plasma's ions to the wafer. `collisions` holds the processes of each ion, in the order
/// of Plasma::ions. Throws std::domain_error with a sentence where no model holds.
SheathResult solve_sheath(const Plasma&,
                          const std::vector<std::vector<fluxes::CollisionProcess>>& collisions,
                          std::uint64_t seed);

} // namespace rille::engine
