// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/arc_average.hpp"
#include "fluxes/ion_tables.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/materials_in_reach.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <functional>
#include <memory>
#include <vector>

namespace rille::fluxes {

/// Nodes [first, end) of the angles at which rates are tabulated.
struct NodeRange {
    int first, end;
};

/// Which sums of tallies are wanted of the ions, and where.
struct WantedSums {
    std::vector<std::vector<int>> members;     ///< [sum]: tallies of the ion tables
    std::vector<std::vector<int>> of_material; ///< [material]: sums wanted there
    const MaterialsInReach* reach = nullptr;   ///< outlives what is gathered
    /// Per element, the angles that its normal may turn to; empty: all.
    std::vector<NodeRange> nodes = {};

    /// Those of the outermost material of an element.
    const std::vector<int>& of(int element) const { return of_material[reach->outermost(element)]; }
};

/// One of the ways of gathering.
class IonGather;

/// Ions that reach each surface element straight from the sheath, as sums of the tallies of the
/// mechanism and as a function of the element's normal. extruded: exact (tables of the distribution
/// over the visible interval of in-plane angles, gathered conservatively per segment). full and
/// revolved: gathered along stratified directions with exact visibility.
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
    /// Domain, surface and caster outlive this. Build the tables once per plasma state.
    DirectIons(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
               std::shared_ptr<const IonTables>, WantedSums, const Options&);
    ~DirectIons();

    /// Sums [nm^-2 s^-1] at element e for its own (conservatively averaged) normal, in the order of
    /// wanted().of(e).
    struct Own {
        const double* value;
        const double* batch; ///< [i * 8 + b]: sum i from direction batch b; null: there is no noise
    };
    Own own(int element) const;
    /// Gives back the memory of own(), which then may not be called.
    void forget_own();
    const WantedSums& wanted() const { return wanted_; }

    /// The sums with the element's normal turned to rate_angles()[k]: row(sum)[k], for the sums of
    /// every material in reach; only at the wanted nodes.
    struct Rows {
        const double* first;
        const int* place;
        std::size_t angles;
        NodeRange nodes;
        const double* row(int sum) const { return first + place[sum] * angles; }
    };
    using UseRows = std::function<void(int element, const Rows&)>;
    /// Calls `use` once for every element, of several at a time. Rows are found anew each time, for
    /// a few elements at once: those of a whole surface take more memory than all else.
    void visit_rows(const UseRows& use) const;
    /// Ion flux [nm^-2 s^-1] of ion species s at element e: conserved over the surface.
    double flux(int s, int element) const;
    /// Normal angles at which rates should be tabulated for this distribution.
    const std::vector<double>& rate_angles() const { return tables_->angles(); }

    const IonTables& tables() const { return *tables_; }
    const std::shared_ptr<const ArcAverage>& average() const;
    const std::vector<Vec3>& normal() const; ///< averaged, per element

    /// full, revolved: the rays of the gather; extruded has none. Species that arrive alike share
    /// those of their group; the flux of a group is the mean over its rays that arrive on the outer
    /// side of (n . r) / r.z, n where it arrives and r against its direction, times the open flux.
    int groups() const;
    int group_of(int ion) const;
    int rays_per_batch() const;
    /// Whether ray k of a batch arrives.
    bool arrives(int group, int element, int batch, int k) const;
    Launch place(const Launcher& of_element, int group, int element, int batch, int k) const;
    IonSample ion(int group, int element, int batch, int k) const;

private:
    std::shared_ptr<const IonTables> tables_;
    WantedSums wanted_;
    std::unique_ptr<IonGather> gather_;
};

} // namespace rille::fluxes
