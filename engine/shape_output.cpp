// SPDX-License-Identifier: Apache-2.0
#include "engine/shape_output.hpp"

#include "engine/case.hpp"
#include "engine/causes.hpp"
#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/profile_csv.hpp"

namespace rille::engine {

std::string causes_csv(const Case& c, const std::vector<ShapePart>& parts) {
    const auto supplies = supply_names(c);
    std::string text =
        "# walls: moved away from the axis at a fixed height z since a wall (65 deg or steeper) "
        "first "
        "stood there; floors: moved downwards at a fixed offset from the axis (round: "
        "radius); deposition counts less than 0\n"
        "# unexplained: what the causes do not add up to, an error of grid and steps; supply: flux "
        "times d(rate)/d(flux) in the same measure, what a small change of that flux changes\n# " +
        std::string(caution) + "\n";
    text += "opening,face,z_nm,offset_nm,since_s,start_nm,now_nm,moved_nm";
    for (const CauseLook& look : cause_looks())
        text += std::string(",") + look.column + "_nm";
    text += ",unexplained_nm";
    for (const std::string& supply : supplies)
        text += ",supply_" + column_name(supply) + "_nm";
    text += "\n";
    for (const ShapePart& part : parts)
        for (const ShapePart::Place& place : part.places) {
            const bool floor = part.face == ShapePart::Face::floor;
            const auto add = [&](double value) { text += "," + shortest(value); };
            text += c.mask.openings[part.opening].name + "," + face_name(part.face);
            add(floor ? place.now_nm : place.at_nm);
            add(floor ? place.at_nm : place.now_nm);
            add(place.since_s);
            add(place.start_nm);
            add(place.now_nm);
            add(part.moved_nm(place));
            for (int k = 0; k < fluxes::cause_count; ++k)
                add(place.removed[k]);
            add(part.unexplained_nm(place));
            for (std::size_t s = 0; s < supplies.size(); ++s)
                add(place.removed[fluxes::cause_count + s]);
            text += "\n";
        }
    return text;
}

} // namespace rille::engine
