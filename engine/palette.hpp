// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::engine {

/// How one material is drawn: a flat colour with a hatch of its own over it, so that materials stay
/// apart in every kind of colour vision, in grey and in a copy.
struct MaterialLook {
    std::string colour; ///< #rrggbb
    int hatch = 0;      ///< 0 none, then as hatch_pattern counts
};

/// Looks for a run's materials: common ones always look the same, others take what is free. The
/// eight colours differ by at least 7 in lightness L* and by at least 15 (CIE 1976) to an eye
/// without green cones.
std::vector<MaterialLook> material_looks(const std::vector<std::string>& materials);

/// SVG markup of the hatch pattern under the given id; empty for hatch 0.
std::string hatch_pattern(const std::string& id, const MaterialLook&);

/// CIE lightness L* of #rrggbb.
double lightness(const std::string& colour);

} // namespace rille::engine
