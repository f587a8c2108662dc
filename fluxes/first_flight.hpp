// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <vector>

namespace rille::fluxes {

/// Where by-products that leave by the law cos^n about the normal come down first, for n other
/// than 1; from there on they fly by the cosine law, as the exchange operator says.
///
/// Gathered where they arrive: directions by the cosine law from every element, each weighted by
/// what the law of emission sends along it over what the cosine law would send. The first flight
/// carries a sampling error, of 8 independent batches; atoms are conserved within it.
class FirstFlight {
public:
    struct Options {
        int rays_per_element = 64; ///< a multiple of `batches`
        std::uint64_t seed = 1;
        std::uint64_t refresh = 0;
    };
    FirstFlight(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
                double cosine_power, const Options&);

    /// arrival = what comes down of `emitted`, per element and area; batch = -1 uses all rays, 0..7
    /// one batch only. They must not overlap.
    void apply(int batch, const double* emitted, double* arrival) const;

private:
    struct Ray {
        std::int32_t from; ///< element hit, or -1
        float weight;
    };
    int per_batch_ = 0;
    std::vector<Ray> rays_; ///< [element][batch][ray]
};

/// What the law cos^n sends along a direction at `cosine` to the normal over what the cosine law
/// sends there: (n + 1) / 2 cos^(n-1). In the plane across an extruded surface, summed over the
/// directions along it: 2 cos^(n-1) / integral of cos^n, as the projection of cos^n onto that plane
/// is cos^n again. Source: derived here.
double emission_weight(double cosine_power, double cosine, bool in_plane);

} // namespace rille::fluxes
