// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"

#include <array>
#include <vector>

namespace rille::fluxes {

/// How an ion, or a fast neutral that it left behind in the sheath, has come to an element. Fast
/// neutrals are one class, whatever they touched before.
enum class IonPath { direct, after_one, after_two, after_more, fast_neutral };
constexpr int ion_paths = 5;
/// Classes of reflected ions: after 1, 2, and 3 or more bounces.
constexpr int bounce_classes = 3;

/// What a rate is made of: ion-enhanced etching by path, then sputtering by path, then what
/// neutrals do by themselves (spontaneous and thermal etching), then deposition, which counts less
/// than 0. Where a film grows, deposition is net of what ions take of it again.
constexpr int enhanced_cause = 0;
constexpr int sputtering_cause = ion_paths;
constexpr int neutral_cause = 2 * ion_paths;
constexpr int deposition_cause = neutral_cause + 1;
constexpr int cause_count = deposition_cause + 1;
using CauseRates = std::array<double, cause_count>; ///< [nm/s]

/// The parts of the rate of a response that belongs to the tallies of all paths together.
/// `by_path[p * tallies + m]`: what path p brings [nm^-2 s^-1]. The coverages are those that all of
/// it makes, so the parts are linear in the tallies and add up to the rate.
CauseRates cause_rates(const Mechanism&, int material, const SurfaceResponse&,
                       const double* by_path);

/// flux x d(rate)/d(flux) [nm/s] of every path of the ions, then of every neutral species, at the
/// place: how the rate answers where less arrives, coverages included. Where nothing happens by
/// heat alone these add up to the rate (Euler, rates being of degree one in all fluxes). Central
/// differences of 1e-4 of each flux.
constexpr int supply_count = ion_paths + max_species;
using SupplyRates = std::array<double, supply_count>;
SupplyRates supply_rates(const Mechanism&, int material, const LocalArrivals& all,
                         const double* by_path);

/// Causes over the elements of a surface: [cause or supply][element] [nm/s].
using CauseFields = std::vector<std::vector<double>>;

} // namespace rille::fluxes
