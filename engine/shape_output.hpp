// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// causes.csv: what each cause has removed [nm], a line per height of every wall and per place of
/// every floor: where the face was first and where it is, how far it has moved, the causes, what
/// they leave unexplained, and what each supply brought (flux times d(rate)/d(flux) over time).
std::string causes_csv(const Case&, const std::vector<ShapePart>&);

/// The same as a picture for the first opening: its profile, what each cause has removed beside
/// the walls by height and below the floor.
std::string cause_picture_svg(const Case&, const SurfaceState&, const std::vector<ShapePart>&);

} // namespace rille::engine
