// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/in_plane.hpp"

#include <vector>

namespace rille::fluxes {

/// An in-plane distribution laid out for drawing first contacts from it: per edge of the bins slope
/// and sine of the angle, per bin the flux in it, its nodes [first_node[b], first_node[b + 1]) and,
/// for the guide, groups of nodes of about one polar angle.
struct PlaneTable {
    static constexpr double steepest = 1e4; ///< slope that stands for 90 deg
    struct Group {
        double weight = 0, least_cosine = 1;
    };
    std::vector<double> slope, sine, share;
    std::vector<int> first_node, first_group;
    std::vector<Group> groups;
    std::vector<double> below; ///< running sum of the weights of the nodes inside their bin
    double least_cosine = 1;   ///< of the polar angles
};

PlaneTable plane_table(const InPlane&);

} // namespace rille::fluxes
