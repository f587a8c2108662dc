// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"
#include "fluxes/ions.hpp"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// An energy (and angle) distribution of ions at the wafer, as read from a CSV file: shares of the
/// flux per bin, sum 1.
///
/// Header lines `# key=value`: `quantity` (flux_fraction_per_bin, flux_per_eV, per_bin,
/// per_eV_per_sr or per_eV_per_deg; required), `energy_reference` (wafer), `angle_convention`
/// (polar), `species`, `mass_amu`, `charge`, `total_flux_m2s`, `source`.
/// - flux_fraction_per_bin: columns E_lo_eV,E_hi_eV,weight.
/// - flux_per_eV: columns E_eV,value; straight lines between the points.
/// - the others: first row a corner cell and the edges of the angle bins [deg from the surface
///   normal]; then one row for each energy bin: its lower edge [eV] and a value for each angle bin;
///   last a row with the upper edge of the last bin alone.
struct IonTable {
    std::vector<double> energy_edges_ev;
    std::vector<double> angle_edges_deg;     ///< empty: energy only
    std::vector<std::vector<double>> weight; ///< [energy][angle]; one column without angles
    std::map<std::string, std::string> header;
    double sum = 1; ///< of the weights as written, before they were normalised
    std::vector<std::string> warnings;
};

/// Nothing if there is a problem; every problem names line and column of the table. `shown` is the
/// file's name in messages.
std::optional<IonTable> read_ion_table(const std::string& path, const std::string& shown,
                                       Problems&);
std::optional<IonTable> parse_ion_table(const std::string& text, const std::string& shown,
                                        Problems&);

/// The distribution for sampling. A table of energy only gets thermal angles: transverse energy
/// exponential with `transverse_ev`, so that in a bin at energy E the share within theta is
/// (1 - exp(-E sin^2(theta) / T)) / (1 - exp(-E / T)).
fluxes::IonDistribution distribution_of(const IonTable&, double transverse_ev);

} // namespace rille::engine
