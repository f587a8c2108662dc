// SPDX-License-Identifier: Apache-2.0
#include "fluxes/plane_table.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

double slope_of(double phi) {
    return std::clamp(std::fabs(phi) < 0.5 * pi ? std::tan(phi)
                                                : std::copysign(PlaneTable::steepest, phi),
                      -PlaneTable::steepest, PlaneTable::steepest);
}

/// Each node by itself where they are few, else an eighth of the cosines of the bin each.
void add_groups(PlaneTable& table, const InPlane& plane, int bin) {
    constexpr int few = 16, many = 8;
    const auto begin = plane.nodes.begin() + table.first_node[bin];
    const auto end = plane.nodes.begin() + table.first_node[bin + 1];
    double sum = 0, low = 1, high = 0;
    for (auto node = begin; node != end; ++node) {
        table.below.push_back(sum += node->weight);
        low = std::min(low, node->cos_polar);
        high = std::max(high, node->cos_polar);
    }
    if (end - begin <= few) {
        for (auto node = begin; node != end; ++node)
            table.groups.push_back({node->weight, node->cos_polar});
    } else {
        std::array<PlaneTable::Group, many> groups;
        const double scale = high > low ? many / (high - low) : 0;
        for (auto node = begin; node != end; ++node) {
            const int which = static_cast<int>((node->cos_polar - low) * scale);
            PlaneTable::Group& group = groups[std::min(which, many - 1)];
            group.weight += node->weight;
            group.least_cosine = std::min(group.least_cosine, node->cos_polar);
        }
        table.groups.insert(table.groups.end(), groups.begin(), groups.end());
    }
    table.first_group.push_back(static_cast<int>(table.groups.size()));
}

} // namespace

PlaneTable plane_table(const InPlane& plane) {
    PlaneTable table;
    for (const double angle : plane.angle) {
        table.slope.push_back(slope_of(angle));
        table.sine.push_back(std::sin(angle));
    }
    table.share.assign(plane.angle.size() - 1, 0.0);
    table.first_node.assign(plane.angle.size(), 0);
    for (const InPlane::Node& node : plane.nodes) {
        table.share[node.bin] += node.weight;
        ++table.first_node[node.bin + 1];
        table.least_cosine = std::min(table.least_cosine, node.cos_polar);
    }
    for (std::size_t b = 1; b < table.first_node.size(); ++b)
        table.first_node[b] += table.first_node[b - 1];
    table.first_group.push_back(0);
    for (int b = 0; b + 1 < static_cast<int>(plane.angle.size()); ++b)
        add_groups(table, plane, b);
    return table;
}

} // namespace rille::fluxes
