// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/in_plane.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/mechanism.hpp"
#include "fluxes/plane_table.hpp"
#include "geometry/domain.hpp"

#include <vector>

namespace rille::fluxes {

/// Appends the numbers that define a yield, apart from its scale; equal numbers, equal laws.
void append_content(const YieldFunction&, std::vector<double>& numbers);

/// What depends on the plasma and the mechanism alone, not on the surface: built once per plasma
/// state and shared by the DirectIons of every refresh.
///
/// extruded: T_m(psi, phi), the tally m on a surface of normal angle psi by the ions from in-plane
/// angles below phi [nm^-2 s^-1]; what a surface receives is a difference of two T.
class IonTables {
public:
    IonTables(geometry::Symmetry, std::vector<IonSource>, std::vector<Tally>);

    /// Whether tables built from these would be the same.
    bool serves(geometry::Symmetry, const std::vector<IonSource>&, const std::vector<Tally>&) const;

    const std::vector<IonSource>& ions() const { return ions_; }
    const std::vector<Tally>& tallies() const { return tallies_; }
    /// Normal angles [rad] at which rates are tabulated: dense where a surface turns out of the
    /// beam, so that rates linear in between are within 1e-3 of the floor's and 1 % of the wall's.
    const std::vector<double>& angles() const { return angles_; }

    /// Table of the flux itself (yield 1) of one ion species, for add().
    int flux_tally(int ion) const { return static_cast<int>(tallies_.size()) + ion; }
    /// row[k] += factor * T_m(angles()[k], place) for first <= k < end. extruded only.
    void add(int tally, const InPlane::Place&, double factor, std::size_t first, std::size_t end,
             double* row) const;
    const InPlane& in_plane(int ion) const { return ions_[ion].distribution.in_plane(); }
    const PlaneTable& plane_table(int ion) const { return plane_[ion]; } ///< extruded only

private:
    void place_angles(geometry::Symmetry);
    std::vector<double> tabulate(const Tally&) const;

    std::vector<IonSource> ions_;
    std::vector<Tally> tallies_;
    std::vector<double> angles_;
    std::vector<double> content_;            ///< everything that the tables follow from
    std::vector<PlaneTable> plane_;          ///< per ion species
    std::vector<std::vector<double>> table_; ///< [tally][edge * angles + k]
};

} // namespace rille::fluxes
