// SPDX-License-Identifier: Apache-2.0
#include "engine/cause_output.hpp"

#include "engine/case.hpp"
#include "engine/cause_bands.hpp"
#include "engine/causes.hpp"
#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/picture.hpp"
#include "engine/profile_csv.hpp"
#include "engine/simulation.hpp"
#include "geometry/check.hpp"

namespace rille::engine {
namespace {

constexpr std::size_t explained = fluxes::cause_count;

/// All pieces of the section, line by line; arc runs along each.
std::vector<SectionWalk> walks_of(const Section& section) {
    std::vector<SectionWalk> walks;
    for (const SectionLine& line : section)
        walks.push_back(longest_walk({line}));
    return walks;
}

} // namespace

std::string causes_csv(const Case& c, const SurfaceState& state) {
    const auto supplies = supply_names(c);
    RILLE_CHECK(state.removed.size() == explained + 1 + supplies.size(), "one field per cause");
    std::string text =
        "# removed along the way of the surface: from walls since the floor has passed "
        "them, from floors since the start of the run; deposition counts less than "
        "0\n"
        "# supply columns: flux times d(rate)/d(flux), summed over the run: what a "
        "small change of that flux changes\n# " +
        std::string(caution) + "\n";
    text += "x_nm,z_nm,arc_length_nm,part,region,material,film";
    for (const CauseLook& look : cause_looks())
        text += std::string(",") + look.column + "_nm";
    text += ",unexplained_nm,total_nm";
    for (const std::string& supply : supplies)
        text += ",supply_" + column_name(supply) + "_nm";
    text += "\n";
    const auto walks = walks_of(vertical_section(c.domain, state.surface, section_y(c)));
    for (std::size_t w = 0; w < walks.size(); ++w)
        for (std::size_t i = 0; i < walks[w].element.size(); ++i) {
            if (walks[w].is_image[i]) continue;
            const int e = walks[w].element[i];
            const auto add = [&](double value) { text += "," + shortest(value); };
            text += shortest(walks[w].middle[i][0]);
            add(walks[w].middle[i][1]);
            add(walks[w].arc[i]);
            text += "," + std::to_string(w) + "," + region_of(c, state.surface, e) +
                    material_row(c, state, e);
            double total = 0;
            for (std::size_t k = 0; k <= explained; ++k) {
                add(state.removed[k][e]);
                total += state.removed[k][e];
            }
            add(total);
            for (std::size_t s = 0; s < supplies.size(); ++s)
                add(state.removed[explained + 1 + s][e]);
            text += "\n";
        }
    return text;
}

} // namespace rille::engine
