// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/stack.hpp"
#include "geometry/surface.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::geometry {

/// A length or angle read off the surface. `elements` are the surface elements that decide it, with
/// the weight d(value)/d(outward displacement of that element) each: the caller turns the carried
/// displacement errors of those elements into a sampling error.
struct Measured {
    double value = 0;
    std::vector<std::pair<int, double>> elements;
};

/// Which feature to measure: an opening of the mask, or the line between two openings.
struct FeatureSite {
    double centre_x = 0, centre_y = 0;   ///< [nm]
    double width_x = 0, width_y = 0;     ///< at the mask bottom before the etch [nm]
    bool round = false;                  ///< a via: y is measured too
};

/// Definitions: see the README table. Every function returns nothing where the quantity does not
/// exist (no wall at that height, feature closed). Heights z in nm; the section plane is y = centre_y,
/// and for CD in y, x = centre_x.
std::optional<Measured> cd_at(const Domain&, const Surface&, const FeatureSite&, double z);
std::optional<Measured> cd_y_at(const Domain&, const Surface&, const FeatureSite&, double z);
/// 2 sqrt(area / pi) of the section at z (full only).
std::optional<Measured> cd_area_at(const Domain&, const Surface&, const FeatureSite&, double z);
/// Widest CD of the film walls between z_low and z_high, and the height where it is.
struct Bow {
    Measured cd;
    double z = 0;
};
std::optional<Bow> widest_cd(const Domain&, const Surface&, const FeatureSite&, double z_low,
                             double z_high);
/// Sidewall angle [deg] of the left and the right wall between two heights (90 vertical, above 90
/// re-entrant): least-squares line through the wall points.
struct SidewallAngles {
    Measured left, right;
};
std::optional<SidewallAngles> sidewall_angles(const Domain&, const Surface&, const FeatureSite&,
                                              double z_low, double z_high);
/// Lowest lit height of the floor on the feature's axis, at its foot (within 10 % of the bottom CD
/// of either wall), and the deepest point: z [nm].
struct Floor {
    Measured centre, left_edge, right_edge, deepest;
};
std::optional<Floor> floor_of(const Domain&, const Surface&, const FeatureSite&);
/// Height of the highest point of the solid within `x_low..x_high` (mask left, top loss).
std::optional<Measured> top_between(const Domain&, const Surface&, double x_low, double x_high,
                                    double y);
/// Angle [deg from horizontal] of the facet at the mask's top edge beside the feature: area-weighted
/// mean over wall elements between 20 and 80 deg within the mask; nothing without such a facet.
std::optional<Measured> mask_facet_angle(const Domain&, const Surface&, const FeatureSite&,
                                         double z_mask_bottom);

} // namespace rille::geometry
