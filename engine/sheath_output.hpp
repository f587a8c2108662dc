// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/output_folder.hpp"
#include "engine/sheath_model.hpp"

#include <nlohmann/json_fwd.hpp>
#include <string>

namespace rille::engine {

struct Case;

/// The table that `rille sheath` prints: for every plasma of the case the sheath, and for every ion
/// how it arrives.
std::string sheath_table(const Case&);
nlohmann::json sheath_json(const Case&);
/// One row for each plasma and kind of particle; units in the header.
std::string sheath_csv(const Case&);
/// Joint shares of energy and angle of one kind of particle as a table that a case can import
/// (`ion_energies: {file: ...}`).
std::string distribution_csv(const std::string& species, double mass_amu, double flux_per_nm2_s,
                             const fluxes::IonDistribution&, const std::string& source);

/// Distributions of energy and angle of every plasma as SVG.
std::string sheath_picture_svg(const Case&);

/// Writes the picture, and with `tables` the CSV files, into a folder.
void write_sheath(OutputFolder&, const Case&, bool tables);

} // namespace rille::engine
