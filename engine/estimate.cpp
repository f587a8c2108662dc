// SPDX-License-Identifier: Apache-2.0
#include "engine/estimate.hpp"

#include "engine/console.hpp"
#include "engine/run.hpp"
#include "engine/run_record.hpp"
#include "engine/symmetric_part.hpp"
#include "geometry/band.hpp"

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>
#include <sstream>

namespace rille::engine {
namespace {

constexpr double pi = 3.14159265358979;
constexpr double pictures_mb = 25; // what drawing and writing the result needs beside the run
constexpr int frames_a_run = 10;

/// Area of the walls of a part of the period [nm^2; of a contour: nm] per nm of their height.
double wall_perimeter(const Case& part) {
    double sum = 0;
    for (const geometry::Opening& opening : part.mask.openings)
        sum += part.domain.extruded()   ? 2
               : part.domain.revolved() ? 1
                                        : 0.5 * pi * (opening.width_x + opening.width_y);
    return sum / part.fold.copies();
}

/// Elements per area of a wall [1/nm^2; of a contour: 1/nm]: one for each grid face that the
/// contour crosses, which on a round wall is the mean of |cos| + |sin|.
double elements_per_area(const geometry::Domain& domain) {
    const double h = domain.spacing;
    return domain.planar_contour() ? 1 / h : 4 / (pi * h * h);
}

} // namespace

Estimate estimate_run(const Case& the_case) {
    Estimate estimate;
    const double before = static_cast<double>(peak_memory_bytes());
    const Case part = symmetric_part(the_case);
    estimate.computed = computed_share(part.fold);
    Simulation simulation(part);
    const Expectation expected = expect(the_case, simulation.open_field());
    estimate.warnings = charging_warnings(the_case, expected);
    // The tables that are made once are made here; then one short advance with all that belongs to
    // it but for the solve on the surface where it starts, which costs as much as the one inside.
    simulation.arrivals();
    const Timings start = simulation.timings();
    const double top_rate = expected.total_s > 0 ? expected.depth_nm / expected.total_s : 0;
    const double h = the_case.domain.spacing;
    simulation.step(top_rate > 0 ? 0.1 * h / top_rate : expected.total_s);
    const Timings& end = simulation.timings();
    const double seconds = end.sum() - start.sum() + end.solves() - start.solves();

    const double now = static_cast<double>(simulation.surface().size());
    const double walls = expected.depth_nm - expected.mask_loss_nm;
    estimate.elements = static_cast<std::size_t>(std::max(
        0.5 * now, now + walls * wall_perimeter(part) * elements_per_area(the_case.domain)));
    const double most = std::max(now, static_cast<double>(estimate.elements));
    const double growth = estimate.elements / std::max(1.0, now);
    estimate.voxels = static_cast<std::size_t>(growth * simulation.front().band().size());
    estimate.memory_mb =
        (before + (peak_memory_bytes() - before) * most / std::max(1.0, now)) / 1e6 + pictures_mb;
    const double fastest =
        std::max(top_rate, simulation.last_dt_s() > 0
                               ? simulation.last_move_cells() * h / simulation.last_dt_s()
                               : 0.0);
    const double advances =
        std::ceil(fastest * expected.total_s / (the_case.refresh_move * h)) + frames_a_run;
    estimate.refreshes = static_cast<int>(2 * advances);
    estimate.process_s = expected.total_s;
    // The surface grows from its present to its final size while the run goes on.
    estimate.wall_seconds = advances * seconds * 0.5 * (1 + growth);
    return estimate;
}

std::string estimate_text(const Case& the_case, const Estimate& e) {
    std::ostringstream text;
    text << "# grid: " << the_case.domain.cells_x;
    if (!the_case.domain.planar_contour()) text << " x " << the_case.domain.cells_y;
    text << " cells of " << the_case.domain.spacing
         << (the_case.domain.revolved() ? " nm from the axis out" : " nm across") << '\n'
         << "# computed: " << e.computed << ", about " << e.voxels << " voxels and " << e.elements
         << " surface elements at the end\n"
         << "# rays: " << the_case.rays_per_element << " per element and refresh, "
         << the_case.ions_per_species << " reflected ions per species\n"
         << "# memory: about " << std::ceil(e.memory_mb) << " MB at most\n"
         << "# time: about " << duration_text(e.process_s) << " of process, " << e.refreshes
         << " refreshes, about " << duration_text(e.wall_seconds) << " on this machine\n";
    for (const auto* list : {&the_case.warnings, &e.warnings})
        for (const std::string& warning : *list)
            text << "# warning: " << warning << '\n';
    return text.str();
}

nlohmann::json estimate_json(const Case& the_case, const Estimate& e) {
    std::vector<std::string> warnings = the_case.warnings;
    warnings.insert(warnings.end(), e.warnings.begin(), e.warnings.end());
    return {{"title", the_case.title},
            {"spacing_nm", the_case.domain.spacing},
            {"computed", e.computed},
            {"voxels", e.voxels},
            {"surface_elements", e.elements},
            {"memory_MB", e.memory_mb},
            {"rays_per_element", the_case.rays_per_element},
            {"refreshes", e.refreshes},
            {"process_time_s", e.process_s},
            {"wall_time_s", e.wall_seconds},
            {"warnings", warnings}};
}

} // namespace rille::engine
