// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <optional>
#include <utility>
#include <vector>

namespace rille::geometry {

/// A length or angle read off the surface. `elements` are the surface elements that decide it, with
/// the weight d(value)/d(outward displacement of that element) each: the caller turns the carried
/// displacement errors of those elements into a sampling error. At fixed height an element's
/// crossing moves by displacement / n.x, on an upright line by displacement / n.z, n being its
/// normal.
struct Measured {
    double value = 0;
    std::vector<std::pair<int, double>> elements;
};

/// Which opening to measure. The axis stands at the centre; images beyond the sides of the period
/// count, so a feature may lie across a side.
struct FeatureSite {
    double centre_x = 0, centre_y = 0; ///< [nm]
    double width_x = 0, width_y = 0;   ///< at the mask bottom before the etch [nm]
    bool round = false;                ///< a via: y is measured too
};

/// Every function returns nothing where the quantity does not exist (no wall at that height,
/// feature closed). Heights z in nm. Everything is read off the section plane y = centre_y of the
/// sub-cell surface (CD in y: x = centre_x). A wall is where that section crosses the height; the
/// gap between walls that holds the axis counts or, if the axis is in the solid there, the gap that
/// covers most of the opening as drawn. At a ledge the wall above it counts.

/// CD: full width of the gap along x at height z.
std::optional<Measured> cd_at(const Domain&, const Surface&, const FeatureSite&, double z);
/// Widths along x of the solid on either side of the gap at height z, to the next gap (which may be
/// the image of the feature itself beyond a side). Nothing where the gap or a next one is missing.
struct Lines {
    Measured left, right;
};
std::optional<Lines> lines_at(const Domain&, const Surface&, const FeatureSite&, double z);
/// CD y: full width of the gap along y at height z (not extruded).
std::optional<Measured> cd_y_at(const Domain&, const Surface&, const FeatureSite&, double z);
/// Area-equivalent CD: 2 sqrt(area / pi) of the level section round the axis at z, less pillars
/// standing in it (full; revolved: twice the radius). Nothing in extruded.
std::optional<Measured> cd_area_at(const Domain&, const Surface&, const FeatureSite&, double z);

/// Bow CD: widest CD between z_low and z_high, and the height where it is (the highest of several).
struct Bow {
    Measured cd;
    double z = 0;
};
std::optional<Bow> widest_cd(const Domain&, const Surface&, const FeatureSite&, double z_low,
                             double z_high);

/// Sidewall angle [deg] of the left and the right wall between two heights: angle inside the solid
/// of the least-squares line x(z) through the wall (90 vertical, below 90 wider at the top, above
/// 90 re-entrant). Nothing unless there are two walls at every height between.
struct SidewallAngles {
    Measured left, right;
};
std::optional<SidewallAngles> sidewall_angles(const Domain&, const Surface&, const FeatureSite&,
                                              double z_low, double z_high);

/// Floor heights z [nm]. centre: on the axis, seen from above. Edges: lowest floor within 10 % of
/// the bottom CD of the left or right wall; bottom CD: at 90 % of the centre's depth below z = 0,
/// but at least half a cell above the floor. deepest: lowest floor between the walls (microtrench
/// depth = centre - deepest). Nothing if the floor is cut off from the source.
struct Floor {
    Measured centre, left_edge, right_edge, deepest;
};
std::optional<Floor> floor_of(const Domain&, const Surface&, const FeatureSite&);

/// Top: highest point of the solid for x_low <= x <= x_high (mask left, top loss).
std::optional<Measured> top_between(const Domain&, const Surface&, double x_low, double x_high,
                                    double y);

/// Mask facet: length-weighted mean angle [deg from horizontal] of the pieces between 20 and 80 deg
/// above the mask bottom that face the opening, up to the next opening. Nothing without such
/// pieces.
std::optional<Measured> mask_facet_angle(const Domain&, const Surface&, const FeatureSite&,
                                         double z_mask_bottom);

} // namespace rille::geometry
