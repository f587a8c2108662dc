// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/materials_file.hpp"
#include "engine/parameters.hpp"
#include "fluxes/yields.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// What one ion does in a process: the yield is `times` that of the law; with `atoms` > 1 the ion's
/// atoms share its energy and each acts on its own.
struct IonShare {
    std::string ion;
    double times = 1;
    double atoms = 1;
};

/// {energy: {law: square root, ...}, angle: {law: plateau then cosine, ...}}. Energy laws: square
/// root, yamamura-tawara, bohdansky, eckstein, constant; angle laws: flat, plateau then cosine,
/// plateau then line, peaked.
std::optional<fluxes::YieldFunction> read_yield(const YamlNode&, const MaterialsLibrary&,
                                                ParameterReader&, Problems&);

/// The ions of a process: `all`, a list of names, or a map of names to {times: ..., atoms: ...}.
/// Every name must be among `known`.
std::vector<IonShare> read_ions(const YamlNode&, const std::vector<std::string>& known,
                                ParameterReader&, Problems&);

/// The yield of one ion.
fluxes::YieldFunction for_ion(const fluxes::YieldFunction&, const IonShare&);

/// All numbers of a yield function: equal functions have equal lists.
std::vector<double> numbers_of(const fluxes::YieldFunction&);

} // namespace rille::engine
