// SPDX-License-Identifier: Apache-2.0
#include "engine/packed_trajectories.hpp"

#include <algorithm>

namespace rille::engine {

namespace {

void pack(const fluxes::ArrivalBins& bins, std::vector<double>& to) {
    to.push_back(static_cast<double>(bins.energy_edges_ev.size()));
    to.push_back(static_cast<double>(bins.angle_edges_deg.size()));
    to.insert(to.end(), bins.energy_edges_ev.begin(), bins.energy_edges_ev.end());
    to.insert(to.end(), bins.angle_edges_deg.begin(), bins.angle_edges_deg.end());
    for (const auto& row : bins.weight)
        to.insert(to.end(), row.begin(), row.end());
}

/// Takes numbers from the front; false once there are too few.
struct Reader {
    const std::vector<double>& values;
    std::size_t next = 0;

    bool take(std::size_t count, std::vector<double>& to) {
        if (count > values.size() - next) return false;
        to.assign(values.begin() + next, values.begin() + next + count);
        next += count;
        return true;
    }
    bool take(fluxes::ArrivalBins& bins) {
        std::vector<double> sizes;
        if (!take(2, sizes) ||
            !(sizes[0] >= 0 && sizes[0] < 1e6 && sizes[1] >= 0 && sizes[1] < 1e6))
            return false;
        if (!take(static_cast<std::size_t>(sizes[0]), bins.energy_edges_ev) ||
            !take(static_cast<std::size_t>(sizes[1]), bins.angle_edges_deg))
            return false;
        if (bins.energy_edges_ev.empty()) return true;
        bins.weight.resize(bins.energy_edges_ev.size() - 1);
        return std::all_of(bins.weight.begin(), bins.weight.end(), [&](std::vector<double>& row) {
            return take(bins.angle_edges_deg.size() - 1, row);
        });
    }
};

} // namespace

std::vector<double> packed(const fluxes::BinnedTrajectories& binned) {
    std::vector<double> values = {binned.fast_neutrals_per_ion};
    pack(binned.ions, values);
    pack(binned.fast_neutrals, values);
    return values;
}

std::optional<fluxes::BinnedTrajectories> unpacked(const std::vector<double>& values) {
    fluxes::BinnedTrajectories binned;
    Reader reader{values};
    std::vector<double> first;
    if (!reader.take(1, first) || !reader.take(binned.ions) || !reader.take(binned.fast_neutrals) ||
        reader.next != values.size() || binned.ions.energy_edges_ev.empty())
        return std::nullopt;
    binned.fast_neutrals_per_ion = first[0];
    return binned;
}

} // namespace rille::engine
