// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath.hpp"

#include <vector>

namespace rille::fluxes {

/// What few collisions do to the ions of one species.
struct FewCollisions {
    struct Part {
        double per_ion; ///< particles of this part for each ion that enters
        IonDistribution particles;
    };
    double uncollided = 1; ///< share of the ions that meet nothing
    /// Their mean energy over that of all ions, had none met anything: in a swinging sheath slow
    /// ions meet more.
    double uncollided_gain = 1;
    std::vector<Part> ions;          ///< the others, by their last collision
    std::vector<Part> fast_neutrals; ///< left in charge exchange
};

/// Collisions to lowest order, by integration over the entry phase, the place of the last collision
/// (Davis and Vanderslice's law: every ion passes every place once, so the collisions per length
/// are those of the uncollided, thinned by what may come after) and the deflection: the new ion
/// starts with the thermal energy of the gas, the fast neutral carries what the ion had there, the
/// deflected ion what the gas left it. Newborn and deflected ions fall in the field of the moment
/// at which they start: where the voltage swings as fast as they fall, the drop they get depends on
/// it by up to a fifth. Some hundred falls, without random numbers. Left out: the change of the
/// rates by an earlier collision and what comes of third ones, 1 % of the collided at a
/// collisionality of 0.1. Throws as SheathField and Encounters do.
FewCollisions few_collisions(const Sheath&, const SheathIon&);

} // namespace rille::fluxes
