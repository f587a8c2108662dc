// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/sheath_arrival.hpp"

#include <optional>
#include <vector>

namespace rille::engine {

/// Binned trajectories as plain numbers, for the cache: share of fast neutrals, then for ions and
/// fast neutrals the numbers of edges, the edges and the weights.
std::vector<double> packed(const fluxes::BinnedTrajectories&);
/// Nothing if the numbers do not fit.
std::optional<fluxes::BinnedTrajectories> unpacked(const std::vector<double>&);

} // namespace rille::engine
