// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// XML poly-data file (.vtp) of one state: lines in the plane y = 0 (extruded) or quads and
/// triangles (full), coordinates in nm, with a cell field for everything that the state holds.
/// Numbers are raw doubles in base64, so reading gives the same bits. `TimeValue` is the time [s].
std::string vtp_text(const Case&, const SurfaceState&);

/// One file of a time series.
struct SeriesEntry {
    double time_s = 0;
    std::string file; ///< relative to the series file
};
/// Series file (.pvd): every frame with its physical time [s].
std::string pvd_text(const std::vector<SeriesEntry>&);

/// Reads back what vtp_text wrote: surface (without `next` and `previous` in full), material, film,
/// grown films, rate, fields, displacement, time. Throws OutputError for anything else.
SurfaceState read_vtp(const Case&, const std::string& path);

} // namespace rille::engine
