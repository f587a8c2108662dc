// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "fluxes/surface_step.hpp"

namespace rille::engine {

/// The sources of one plasma in the order that the case's mechanism expects; species that the
/// plasma does not supply get flux 0.
fluxes::Sources sources_of(const Case&, const Plasma&);

} // namespace rille::engine
