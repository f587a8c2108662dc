// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <memory>
#include <vector>

namespace rille::fluxes {

/// Ions that reach each surface element straight from the sheath, as every tally of the mechanism
/// and as a function of the element's normal. extruded: exact (tables of the distribution over the
/// visible interval of in-plane angles, gathered conservatively per segment). full: gathered along
/// stratified directions with exact visibility.
class DirectIons {
  public:
    struct Options {
        int directions = 256; ///< full only
        std::uint64_t seed = 1;
        std::uint64_t refresh = 0;
    };
    DirectIons(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
               const std::vector<IonSource>&, const std::vector<Tally>&, const Options&);
    ~DirectIons();

    /// Tally m [nm^-2 s^-1] at element e for its own (conservatively averaged) normal.
    double tally(int m, int element) const;
    /// The same with the normal turned to `angle` (convention of geometry::NormalRates).
    double tally_at(int m, int element, double angle) const;
    /// Ion flux [nm^-2 s^-1] of ion species s at element e: conserved over the surface.
    double flux(int s, int element) const;
    /// Normal angles at which rates should be tabulated for this distribution.
    std::vector<double> rate_angles() const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

} // namespace rille::fluxes
