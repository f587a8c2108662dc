// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath_trajectories.hpp"

#include <vector>

namespace rille::fluxes {

/// By which way the ions of one species were taken through the sheath.
enum class SheathWay {
    free_fall,   ///< steady voltage, few collisions: exact but for these
    closed_form, ///< damped voltage, few collisions
    trajectories ///< followed one by one
};

/// Thickness over mean free path above which the closed forms, which know collisions to lowest
/// order (few_collisions), are refused. They take up to 4.6 % of the mean energy below (a / (m + 1)
/// by Davis and Vanderslice, derived); what is left out, of third order, is less than 0.05 %.
constexpr double collisionless_below = 0.1;

/// Thickness over mean free path above which ions drift: what they keep of the fall between two
/// collisions is then a matter of mobility.
constexpr double most_collisions = 100;

/// Chooses: where collisions count ions are followed one by one; so they are under a moving edge.
SheathWay way_through(const Sheath&, const SheathIon&);

/// What one ion species brings to the wafer.
struct SheathArrival {
    SheathWay way = SheathWay::free_fall;
    std::vector<IonDistribution> ions;          ///< one
    std::vector<IonDistribution> fast_neutrals; ///< one; none without charge exchange
    double fast_neutrals_per_ion = 0;
};

/// Followed ions, sorted into bins.
struct BinnedTrajectories {
    ArrivalBins ions, fast_neutrals;
    double fast_neutrals_per_ion = 0;
};

/// Throws std::domain_error with a sentence where no way holds: a voltage below zero, more than
/// most_collisions, or ions that gain less than the thermal energy of the gas in a mean free path.
void check_range(const Sheath&, const SheathIon&);
/// The ways without trajectories: the damped voltage for the ions that meet nothing, and
/// few_collisions.
SheathArrival arrive_in_closed_form(const Sheath&, const SheathIon&);
BinnedTrajectories follow_into_bins(const Sheath&, const SheathIon&, const TrajectorySampling&);
SheathArrival arrival_of(const BinnedTrajectories&);
/// All of it: checked, by the way that holds.
SheathArrival arrive(const Sheath&, const SheathIon&, const TrajectorySampling&);

/// Everything that trajectories follow from, as numbers; equal numbers, equal arrivals.
std::vector<double> content_of(const Sheath&, const SheathIon&, const TrajectorySampling&);

} // namespace rille::fluxes
