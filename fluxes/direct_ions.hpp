// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ion_tables.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <memory>
#include <vector>

namespace rille::fluxes {

/// Ions that reach each surface element straight from the sheath, as every tally of the mechanism
/// and as a function of the element's normal. extruded: exact (tables of the distribution over the
/// visible interval of in-plane angles, gathered conservatively per segment). full and revolved:
/// gathered along stratified directions with exact visibility.
///
/// Tallies are averages over about five cells of surface, never across a corner, that keep the flux
/// of the elements averaged over.
class DirectIons {
public:
    struct Options {
        /// full and revolved only, per element and per group of species that arrive alike; rounded
        /// up to a multiple of 8. The average over about 25 elements makes the most of them.
        int directions = 64;
        std::uint64_t seed = 1;
        std::uint64_t refresh = 0;
    };
    DirectIons(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
               const std::vector<IonSource>&, const std::vector<Tally>&, const Options&);
    /// The same with tables built before. Build them once per plasma state.
    DirectIons(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
               std::shared_ptr<const IonTables>, const Options&);
    ~DirectIons();

    /// Tally m [nm^-2 s^-1] at element e for its own (conservatively averaged) normal.
    double tally(int m, int element) const;
    /// The same with the normal turned to `angle` (convention of geometry::NormalRates).
    double tally_at(int m, int element, double angle) const;
    /// tally_at(m, e) at the angle rate_angles()[a] is factor * value[a], without interpolation.
    struct TallyRow {
        const float* value = nullptr;
        double factor = 1;
    };
    TallyRow tally_row(int m, int element) const;
    /// tally(m, e) from direction batch b of 0..7 alone; extruded has no noise: tally(m, e).
    double tally_batch(int b, int m, int element) const;
    /// Ion flux [nm^-2 s^-1] of ion species s at element e: conserved over the surface.
    double flux(int s, int element) const;
    /// Normal angles at which rates should be tabulated for this distribution.
    const std::vector<double>& rate_angles() const;

    const IonTables& tables() const { return *tables_; }

    /// full, revolved: one ray of the gather; extruded has none.
    struct SeenRay {
        float received = 0; ///< (r . n) / r_z if it came from the sky onto the outer side, else 0
        float cosine = 0;   ///< of the incidence on the averaged normal
    };
    struct SkyRay {
        Launch from;
        IonSample ion;
    };
    /// Rays of each of the 8 batches, and the rays [batch * rays_per_batch() + k] of an element by
    /// which the flux of an ion species was found: that is the mean of `received` times the open
    /// flux.
    int rays_per_batch() const { return gathered_.rays_per_batch; }
    const SeenRay* seen(int ion, int element) const {
        return gathered_.seen[gathered_.group_of[ion]].data() +
               std::size_t(element) * 8 * gathered_.rays_per_batch;
    }
    /// Gives back the memory of seen() and of tally_batch(), which then may not be called.
    void forget_rays();
    /// Ray k of a batch again. `surface` is the one that the flux was gathered on.
    SkyRay ray(const geometry::Surface& surface, int ion, int element, int batch, int k) const;

    /// What one of the two ways of gathering leaves behind. Vectors over elements.
    struct Gathered {
        std::vector<std::vector<float>> row;    ///< [row][e * angles + k] [nm^-2 s^-1] / factor
        std::vector<int> row_of;                ///< row of each tally
        std::vector<double> factor;             ///< of each tally, by which its row is multiplied
        std::vector<std::vector<double>> flux;  ///< [ion][e]
        std::vector<std::vector<double>> tally; ///< [tally][e]
        std::vector<std::vector<double>> batch; ///< [tally][e * 8 + b]; extruded: empty
        int rays_per_batch = 0;                 ///< this and what follows: not extruded
        std::vector<int> group_of;              ///< ions that arrive alike share rays: [ion]
        std::vector<std::vector<SeenRay>> seen; ///< [group][(e * 8 + b) * rays_per_batch + k]
    };

private:
    std::shared_ptr<const IonTables> tables_;
    Options options_;
    Gathered gathered_;
};

/// The two ways; used through DirectIons.
DirectIons::Gathered gather_extruded(const geometry::Domain&, const geometry::Surface&,
                                     const IonTables&);
DirectIons::Gathered gather_full(const geometry::Domain&, const geometry::Surface&,
                                 const geometry::RayCaster&, const IonTables&,
                                 const DirectIons::Options&);

/// Ray k of a batch of the full gather from element e: a place on it and an ion that may come
/// there.
DirectIons::SkyRay sky_ray(const geometry::Surface&, const IonDistribution&,
                           const DirectIons::Options&, int e, int group, int batch, int k);

/// Linear interpolation of a row at `angle`.
double on_row(const std::vector<double>& angles, const float* row, double angle);

} // namespace rille::fluxes
