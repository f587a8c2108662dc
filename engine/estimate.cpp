// SPDX-License-Identifier: Apache-2.0
#include "engine/estimate.hpp"

#include "engine/console.hpp"
#include "engine/run.hpp"
#include "engine/run_record.hpp"
#include "geometry/band.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <nlohmann/json.hpp>
#include <sstream>

namespace rille::engine {
namespace {

/// Area of the walls [nm^2, extruded nm] that the expected depth adds.
double wall_area(const Case& the_case, double depth) {
    double area = 0;
    for (const geometry::Opening& opening : the_case.mask.openings)
        area += the_case.domain.extruded()
                    ? 2 * depth
                    : 3.14159265358979 * 0.5 * (opening.width_x + opening.width_y) * depth;
    return area;
}

} // namespace

Estimate estimate_run(const Case& the_case) {
    using Clock = std::chrono::steady_clock;
    Estimate estimate;
    Simulation simulation(the_case);
    const Expectation expected = expect(the_case);
    const double h = the_case.domain.spacing;
    // One short advance with all that belongs to it: two solves, the move, the new surface.
    const double top_rate = expected.total_s > 0 ? expected.depth_nm / expected.total_s : 0;
    const auto start = Clock::now();
    simulation.step(top_rate > 0 ? 0.1 * h / top_rate : expected.total_s);
    const double seconds = std::chrono::duration<double>(Clock::now() - start).count();
    const double cell = the_case.domain.extruded() ? h : h * h;
    const std::size_t now = simulation.surface().size();
    estimate.elements =
        now + static_cast<std::size_t>(1.3 * wall_area(the_case, expected.depth_nm) / cell);
    const double growth = now == 0 ? 1.0 : static_cast<double>(estimate.elements) / now;
    estimate.voxels = static_cast<std::size_t>(growth * simulation.front().band().size());
    estimate.memory_mb = growth * peak_memory_bytes() / 1e6;
    estimate.refreshes = static_cast<int>(std::ceil(2 * expected.depth_nm / h)) + 1;
    estimate.process_s = expected.total_s;
    // The surface grows from its present to its final size while the run goes on.
    estimate.wall_seconds = estimate.refreshes * seconds * 0.5 * (1 + growth);
    return estimate;
}

std::string estimate_text(const Case& the_case, const Estimate& e) {
    std::ostringstream text;
    text << "grid: " << the_case.domain.cells_x;
    if (!the_case.domain.extruded()) text << " x " << the_case.domain.cells_y;
    text << " cells of " << the_case.domain.spacing << " nm across, about " << e.voxels
         << " voxels and " << e.elements << " surface elements at the end\n"
         << "rays: " << the_case.rays_per_element << " per element and refresh, "
         << the_case.ions_per_species << " reflected ions per species\n"
         << "memory: about " << std::ceil(e.memory_mb) << " MB at most\n"
         << "time: about " << duration_text(e.process_s) << " of process, " << e.refreshes
         << " refreshes, about " << duration_text(e.wall_seconds) << " on this machine\n";
    return text.str();
}

nlohmann::json estimate_json(const Case& the_case, const Estimate& e) {
    std::vector<std::string> warnings = the_case.warnings;
    for (const std::string& warning : charging_warnings(the_case))
        warnings.push_back(warning);
    return {{"title", the_case.title},
            {"spacing_nm", the_case.domain.spacing},
            {"voxels", e.voxels},
            {"surface_elements", e.elements},
            {"memory_MB", e.memory_mb},
            {"rays_per_element", the_case.rays_per_element},
            {"refreshes", e.refreshes},
            {"process_time_s", e.process_s},
            {"wall_time_s", e.wall_seconds},
            {"warnings", the_case.warnings}};
}

} // namespace rille::engine
