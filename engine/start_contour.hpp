// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/measured.hpp"
#include "geometry/domain.hpp"
#include "geometry/polyline_distance.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// The surface that a run starts from.
struct StartContour {
    std::string source; ///< name of the file
    /// Lines that together run once from side to side with the gas above, then closed voids.
    std::vector<geometry::Polyline> lines;
    double low = 0, high = 0; ///< [nm] everything lies between
};

/// Signed distance to the solid that a contour bounds, exact within five cells, held beyond.
std::function<double(const geometry::Vec3&)> start_distance(const geometry::Domain&,
                                                            const StartContour&);

/// Reads points as read_contour does, or a profile.csv that a run has left, whose elements give the
/// vertices back exactly. Open gaps, a contour that crosses itself, does not span the period,
/// leaves it, or runs from right to left are problems at the place in the file. Ends up to a cell
/// short of a side are continued level. With `frame.revolved` the first column is r_nm. Says in
/// `warnings` what of a profile is left out: films that had grown.
StartContour read_start(const std::string& path, const ContourFrame& frame, const geometry::Domain&,
                        std::vector<std::string>& warnings, Problems&);

} // namespace rille::engine
