// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/exchange.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

/// Tallies of ions after one or more reflections, per element, with 8 independent batches.
struct ReflectedIons {
    /// value[b][m * elements + e]: tally m at element e by batch b [nm^-2 s^-1].
    std::vector<std::vector<double>> value;
    double lost_share =
        0; ///< ion flux lost to roulette bookkeeping or lost rays, share of incident
};

struct ReflectionOptions {
    int ions_per_species = 65536; ///< launched through the source plane, a multiple of `batches`
    std::uint64_t seed = 1;
    std::uint64_t refresh = 0;
};

/// Forward tracing in fixed chunks, each with its own buffer, summed in order. `reflection[m]` is
/// the law of material m; material[e] the material at each element. Direct arrivals are not
/// tallied.
ReflectedIons trace_reflected(const geometry::Domain&, const geometry::Surface&,
                              const geometry::RayCaster&, const std::vector<int>& material,
                              const std::vector<IonSource>&, const std::vector<Tally>&,
                              const std::vector<IonReflection>& reflection,
                              const ReflectionOptions&);

} // namespace rille::fluxes
