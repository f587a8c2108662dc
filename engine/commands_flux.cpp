// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/commands.hpp"
#include "engine/console.hpp"
#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"
#include "engine/picture.hpp"
#include "engine/problems.hpp"
#include "engine/surface_flux.hpp"
#include "engine/symmetric_part.hpp"
#include "engine/words.hpp"

#include <iostream>
#include <nlohmann/json.hpp>
#include <unistd.h>

namespace rille::engine {
namespace {

/// The plasma to evaluate; throws InputError if the case has none of that name.
std::string plasma_of(const Case& c, const std::string& asked) {
    if (asked.empty()) return c.steps.front().plasma;
    if (c.plasmas.count(asked)) return asked;
    std::vector<std::string> names;
    for (const auto& named : c.plasmas)
        names.push_back(named.first);
    Problems problems;
    problems.add({"--plasma", 0, 0}, "",
                 "no plasma is called " + quoted(asked) + "; there are: " + listed(names) +
                     did_you_mean(asked, names));
    problems.throw_if_any();
    return "";
}

void tell(Progress& progress, double share, const char* words) {
    ProgressState state;
    state.share = share;
    state.words = words;
    progress.update(state);
}

} // namespace

int flux_command(const std::string& case_path, const std::string& plasma, const std::string& folder,
                 bool force, const CommonOptions& options) {
    std::vector<std::string> overrides = options.overrides;
    if (options.seed) overrides.push_back("sampling.seed=" + std::to_string(*options.seed));
    const Case c = load_case(case_path, overrides);
    const std::string burning = plasma_of(c, plasma);
    OutputFolder out(folder,
                     force ? OutputFolder::Existing::force : OutputFolder::Existing::refuse);
    Progress progress(std::cerr, Progress::style_for(STDERR_FILENO, options.quiet));
    tell(progress, 0, "surface");
    const Case part = symmetric_part(c);
    const Simulation simulation(part);
    tell(progress, 0.1, "arrivals");
    const SurfaceFlux flux = unfolded(part, surface_flux(part, simulation, burning));
    tell(progress, 0.9, "files");
    const nlohmann::json json = flux_json(c, flux, options.command_line);
    const std::string picture = flux_picture_svg(c, flux);
    out.write(output_names::flux_csv, flux_csv(c, flux));
    out.write(output_names::flux_json, json.dump(2) + "\n");
    out.write(output_names::flux_svg, picture);
    out.write(output_names::flux_png, png_of(picture, 2));
    tell(progress, 1, "done");
    progress.finish();
    Health health;
    health.rays = flux.rays;
    health.lost_rays = flux.lost_rays;
    if (options.json)
        std::cout << json.dump(2) << '\n';
    else if (!options.quiet)
        std::cout << flux_table(c, flux) << "written into " << folder << '\n';
    check_lost_rays(health);
    return 0;
}

} // namespace rille::engine
