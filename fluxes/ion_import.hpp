// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"

#include <vector>

namespace rille::fluxes {

/// What the cells of an imported table of ion energies and polar angles mean. All are FLUXES through
/// the wafer plane: a retarding-field analyser gives flux per energy as it is.
enum class IonTableQuantity { per_bin, per_ev_per_sr, per_ev_per_deg };

struct IonImport {
    IonDistribution distribution;
    double factor = 1;            ///< by which the converted weights were multiplied to sum to 1
    double last_energy_share = 0; ///< of the flux in the last energy bin: > 0.01 looks cut off
    double last_angle_share = 0;  ///< of the flux in the last angle bin
    double beyond_60_share = 0;   ///< of the flux at polar angles beyond 60 deg
};

/// Checked conversion of a table cell[e][a] over energy edges [eV] and polar-angle edges [deg] to a
/// distribution. Throws std::invalid_argument with a reason: edges not finite, not increasing or out
/// of range, cells missing, negative, not finite or all zero.
IonImport import_ions(const std::vector<double>& energy_edges_ev,
                      const std::vector<double>& angle_edges_deg,
                      std::vector<std::vector<double>> cell, IonTableQuantity quantity);

} // namespace rille::fluxes
