// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/arc_average.hpp"
#include "fluxes/causes.hpp"
#include "fluxes/direct_ions.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <memory>
#include <vector>

namespace rille::fluxes {

/// Sums of tallies of ions after one or more reflections, per element, with 8 independent batches.
/// Held as what single hits bring: their number does not grow with the surface.
struct ReflectedIons {
    struct Deposit {
        int element;
        int slot;     ///< (batch * bounce_classes + k) * sums + s, k = 0, 1, 2 for ions after 1, 2
                      ///< and 3 or more bounces
        double value; ///< to sum s [nm^-2 s^-1]
    };
    int sums = 0;
    std::vector<Deposit> deposits; ///< element after element
    std::vector<int> first;        ///< of each element, one more at the end; or empty
    /// What is averaged over; null: each element stands for itself.
    std::shared_ptr<const ArcAverage> average;

    std::size_t slots() const { return std::size_t(batches) * bounce_classes * sums; }
    /// What comes to an element: value[slot].
    void at(int element, std::vector<double>& value) const;

    /// Where they come from: angle of the mean direction towards their origin, weighted by flux, in
    /// the plane of the element's normal and z (convention of geometry::NormalRates); the
    /// normal's own angle where none come.
    std::vector<double> from_angle;
    double lost_share =
        0; ///< ion flux lost to roulette bookkeeping or lost rays, share of incident
};

struct ReflectionOptions {
    /// Followed from their first contact on; shared out among the species by the flux that each
    /// reflects.
    int ions_per_species = 8192;
    std::uint64_t seed = 1;
    std::uint64_t refresh = 0;
    /// Tallies averaged over the surroundings like the direct ones: over about five cells of
    /// surface, never across a corner, sums kept.
    bool averaged = true;
};

/// Ions are drawn where they first strike, in proportion to the direct flux times the probability
/// of reflection, and followed from there: fixed chunks, each with its own buffer, summed in order.
/// `reflection[m]` is the law of material m; material[e] the material at each element. Ions and
/// sums are those of `direct`, gathered on the same surface. Direct arrivals are not tallied.
ReflectedIons trace_reflected(const geometry::Domain&, const geometry::Surface&,
                              const geometry::RayCaster&, const std::vector<int>& material,
                              const DirectIons& direct,
                              const std::vector<IonReflection>& reflection,
                              const ReflectionOptions&);

/// Share of the reflected ions found on an element that is left when its normal turns from `own` to
/// `angle` [rad]: the ratio of the cosines to the direction that they come from, at most 1. The
/// first 10 degrees of the turn do not count, since arrivals at a wall are found for a mean normal
/// that the front has only to within a fraction of that; from there on the turn counts more, so
/// that a right angle is one. So a floor's ions do not act on the wall that it leaves behind.
double share_after_turn(double own, double from, double angle);

} // namespace rille::fluxes
