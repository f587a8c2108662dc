// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"
#include "engine/simulation.hpp"
#include "fluxes/causes.hpp"

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <vector>

namespace rille::engine {

/// One quantity on every element with its 95 % sampling error (empty where it has none). Names and
/// units as in NamedField. NaN where the quantity does not exist (the energy of no ion).
struct FluxColumn {
    std::string name, unit;
    std::vector<double> value, error;
};

/// What arrives on a surface and what it does there, at one instant, without moving it.
struct SurfaceFlux {
    std::string plasma;
    SurfaceState state; ///< surface, materials and grown films
    std::vector<FluxColumn> columns;
    fluxes::CauseFields cause; ///< [cause][element] [nm/s]
    std::uint64_t rays = 0, lost_rays = 0;
    int iterations = 0; ///< of transport and kinetics against each other
    double residual = 0;
};

/// Evaluates the present surface of a simulation under one of the case's plasmas. The simulation is
/// left as it is.
SurfaceFlux surface_flux(const Case&, const Simulation&, const std::string& plasma);

/// flux.csv: one line per element, place and material first, each quantity followed by its error
/// (`..._error_UNIT`, 95 % of sampling). Empty fields: the quantity does not exist there.
std::string flux_csv(const Case&, const SurfaceFlux&);
/// flux.json: how it was found, what it stands on, and means over the parts of the surface.
nlohmann::json flux_json(const Case&, const SurfaceFlux&, const std::string& command);
/// The means by part of the surface as a table for people.
std::string flux_table(const Case&, const SurfaceFlux&);
/// The section beside ion flux, neutrals, and the rate by its causes along the surface.
std::string flux_picture_svg(const Case&, const SurfaceFlux&);

} // namespace rille::engine
