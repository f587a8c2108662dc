// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <vector>

namespace rille::fluxes {

/// Number of independent direction batches behind every sampling error.
constexpr int batches = 8;

/// The exchange operator of neutrals in free-molecular flow with diffuse re-emission: traced once,
/// solved for many species. Arrivals follow from arrival = d + A (1 - sticking) arrival, fluxes
/// relative to the open one. Row sum of A plus d is 1 by construction.
class Exchange {
  public:
    struct Options {
        int rays_per_element = 64; ///< a multiple of `batches`
        std::uint64_t seed = 1;
        std::uint64_t refresh = 0; ///< a new scramble for every refresh
    };
    Exchange(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
             const Options&);

    std::size_t size() const { return direct_.size(); }
    /// Impinging flux per element relative to the open flux, for sticking per element in [0, 1].
    /// batch = -1 uses all rays, 0..7 one batch only. `guess` may be empty (warm start otherwise).
    std::vector<double> solve(const std::vector<double>& sticking, int batch,
                              const std::vector<double>& guess) const;
    const std::vector<double>& direct() const { return direct_; }
    int last_iterations() const { return last_iterations_; }

  private:
    std::vector<double> direct_;
    mutable int last_iterations_ = 0;
    struct Row;
    int rays_ = 0;
    std::vector<std::int32_t> target_;       ///< element hit by each ray, -1 = open
    std::vector<std::vector<double>> batch_direct_;
};

} // namespace rille::fluxes
