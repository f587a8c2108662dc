// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/parameters.hpp"
#include "fluxes/mechanism.hpp"

namespace rille::engine {

/// Reads the law by which ions leave a wall; keys that are absent keep the value of `otherwise`.
fluxes::IonReflection read_reflection(const YamlNode&, const fluxes::IonReflection& otherwise,
                                      ParameterReader&, Problems&);

} // namespace rille::engine
