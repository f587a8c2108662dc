// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"

#include <vector>

namespace rille::fluxes {

/// A mechanism by the sums that drive its processes: kinetics only ever takes sums of tallies, of
/// which there are few, and few of these act on any one material.
struct TallySums {
    std::vector<std::vector<int>> members;     ///< [sum]: tallies of the mechanism that it adds up
    std::vector<std::vector<int>> of_material; ///< [material]: sums that act on it
    /// The same mechanism whose tally i on a material is sum of_material[material][i]; it has as
    /// many tallies as any material has sums, and their yields mean nothing.
    Mechanism mechanism;
};
TallySums sum_tallies(const Mechanism&);
/// Every tally as a sum of its own that counts on every material, for looking at them one by one.
TallySums every_tally(const Mechanism&);

} // namespace rille::fluxes
