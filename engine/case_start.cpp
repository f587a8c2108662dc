// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include <fmt/format.h>

namespace rille::engine {

void build_start(const Entry& root, Case& result, Problems& problems) {
    const Entry& start = root["start"];
    if (!start.is_given || !start.is_good || result.domain.cells_x < 1 ||
        !(result.domain.spacing > 0))
        return;
    if (result.domain.symmetry == geometry::Symmetry::full) {
        problems.add(
            start.at, start.path,
            "a contour is a section; full has none that says it all: use extruded or revolved");
        return;
    }
    if (root["liner"].is_given)
        problems.add(root["liner"].at, root["liner"].path,
                     "belongs to mask and stack as drawn; with start leave it out");
    ContourFrame frame;
    frame.key = "start";
    frame.revolved = result.domain.revolved();
    const std::size_t before = problems.size();
    read_frame(start, frame, problems);
    if (problems.size() != before) return;
    StartContour contour =
        read_start(start["contour"].text, frame, result.domain, result.warnings, problems);
    if (problems.size() != before) return;
    double highest = contour.low;
    for (const auto& line : contour.lines)
        for (const auto& point : line)
            highest = std::max(highest, point[1]);
    const double top = result.films.empty() ? 0 : result.films.front().top;
    if (highest > top + 0.5 * result.domain.spacing)
        result.warnings.push_back(fmt::format(
            "start: the contour reaches {:.4g} nm above the top of the {} at {:.4g} nm; what lies "
            "above is taken for the same",
            highest - top, result.films.empty() ? "stack" : result.films.front().name, top));
    result.start = std::move(contour);
}

} // namespace rille::engine
