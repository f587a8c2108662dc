// SPDX-License-Identifier: Apache-2.0
#include "engine/causes.hpp"

#include "engine/case.hpp"

#include <cmath>

namespace rille::engine {

namespace {

constexpr const char* path_names[fluxes::ion_paths] = {"direct_ions", "ions_after_1_bounce",
                                                       "ions_after_2_bounces",
                                                       "ions_after_3_or_more", "fast_neutrals"};

} // namespace

const std::array<CauseLook, fluxes::cause_count>& cause_looks() {
    static const std::array<CauseLook, fluxes::cause_count> looks = {{
        {"ion_enhanced_direct_ions", "direct ions", "#0f2a66", false},
        {"ion_enhanced_ions_after_1_bounce", "ions after 1 bounce", "#2f6db5", false},
        {"ion_enhanced_ions_after_2_bounces", "ions after 2 bounces", "#6fa8dc", false},
        {"ion_enhanced_ions_after_3_or_more", "ions after 3 or more", "#b9d7f2", false},
        {"ion_enhanced_fast_neutrals", "fast neutrals", "#c99a00", false},
        {"sputtering_direct_ions", "sputtered by direct ions", "#0f2a66", true},
        {"sputtering_ions_after_1_bounce", "sputtered after 1 bounce", "#2f6db5", true},
        {"sputtering_ions_after_2_bounces", "sputtered after 2 bounces", "#6fa8dc", true},
        {"sputtering_ions_after_3_or_more", "sputtered after 3 or more", "#b9d7f2", true},
        {"sputtering_fast_neutrals", "sputtered by fast neutrals", "#c99a00", true},
        {"neutrals_alone", "neutrals without ions", "#b5451b", false},
        {"deposition", "deposition (less)", "#a0a0a0", false},
    }};
    return looks;
}

std::vector<std::string> supply_names(const Case& c) {
    std::vector<std::string> names(path_names, path_names + fluxes::ion_paths);
    names.insert(names.end(), c.mechanism.neutrals.begin(), c.mechanism.neutrals.end());
    return names;
}

const char* face_name(ShapePart::Face face) {
    switch (face) {
    case ShapePart::Face::left_wall:
        return "left wall";
    case ShapePart::Face::right_wall:
        return "right wall";
    case ShapePart::Face::wall:
        return "wall";
    case ShapePart::Face::floor:
        break;
    }
    return "floor";
}

const char* region_of(const Case& c, const geometry::Surface& s, std::size_t element,
                      bool is_image) {
    const geometry::Vec3 n = s.normal[element];
    if (n.z < -0.5) return "overhang";
    if (n.z <= 0.5) return (n.x > 0) != is_image ? "left wall" : "right wall";
    const double h = c.domain.spacing, lowest_top = c.mask.thickness > 0 ? 0.5 * h : -0.5 * h;
    return s.centre[element].z > lowest_top ? "top" : "floor";
}

} // namespace rille::engine
