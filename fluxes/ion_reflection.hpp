// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"
#include "geometry/vec.hpp"

#include <array>
#include <cstdint>

namespace rille::fluxes {

/// Probability that an ion at this cosine of incidence leaves again:
/// probability * ((theta - critical) / (90 - critical))^exponent, 0 below critical. Form published
/// for hyperthermal ions on walls [from memory].
double reflection_probability(const IonReflection&, double cos_incidence);

/// Share of the energy kept by an ion of `ion_amu`: the deflection 180 - 2 theta is shared equally
/// between `collisions` elastic two-body collisions with atoms at rest, K(chi/N)^N with
/// K = [(cos chi + sqrt(mu^2 - sin^2 chi)) / (1 + mu)]^2, mu = target mass / ion mass (kinematics,
/// derived here). 1 for no collisions; 0 where a light target cannot turn the ion that far.
double energy_kept(const IonReflection&, double ion_amu, double cos_incidence);

/// Direction after reflection: specular about the averaged normal `mean`, with Gaussian scatter
/// (standard deviation per transverse angle) truncated to directions that leave both the averaged
/// and the element's own plane. All unit vectors; `first` are the two numbers in [0, 1) used
/// first, `key` names the random numbers for what is refused.
geometry::Vec3 reflected_direction(const IonReflection&, const geometry::Vec3& incoming,
                                   const geometry::Vec3& mean, const geometry::Vec3& own,
                                   const std::array<double, 2>& first, std::uint64_t key);

} // namespace rille::fluxes
