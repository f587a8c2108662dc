// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"
#include "engine/yaml_reader.hpp"
#include "fluxes/mechanism.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// A neutral that surfaces give off, as a chemistry file declares it.
struct ByProduct {
    double cosine_power = 1; ///< n of the law cos^n about the normal by which it leaves
    std::string film;        ///< material that it builds up where it sticks; empty: it does not
    double sticking = 0;     ///< probability, on any surface
};

/// By-products that the processes of the given materials give off, in the order of the section
/// `by_products`; where those build up films, what these give off, too. Reads nothing but names.
std::vector<std::string> by_products_in_use(const YamlNode& materials, const YamlNode& by_products,
                                            std::vector<std::string> used_materials);

/// Lets neutral `neutral` stick on every surface of the mechanism as a film of its material `film`,
/// which ions remove from there as they sputter that material. A surface without room for another
/// adsorbate is a problem at `at`.
void add_redeposition(fluxes::Mechanism&, int neutral, int film, double sticking,
                      const YamlNode& at, Problems&);

} // namespace rille::engine
