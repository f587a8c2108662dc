// SPDX-License-Identifier: Apache-2.0
#include "engine/sources.hpp"

#include "engine/sheath_model.hpp"

#include <algorithm>

namespace rille::engine {

fluxes::Sources sources_of(const Case& the_case, const Plasma& plasma) {
    fluxes::Sources sources;
    sources.wafer_temperature_k = the_case.wafer_temperature_k;
    for (const std::string& name : the_case.mechanism.ions) {
        fluxes::IonSource source;
        source.name = name;
        if (plasma.arrivals)
            for (const IonAtWafer& ion : plasma.arrivals->ions)
                if (ion.name == name) {
                    source.mass_amu = ion.mass_amu;
                    source.flux = ion.flux + ion.fast_neutral_flux;
                    source.distribution = ion.arriving.front();
                }
        sources.ions.push_back(source);
    }
    for (const std::string& name : the_case.mechanism.neutrals) {
        fluxes::NeutralSource source;
        source.name = name;
        for (const PlasmaNeutral& neutral : plasma.neutrals)
            if (neutral.name == name) {
                source.flux = neutral.flux;
                source.temperature_k = neutral.temperature_k;
            }
        sources.neutrals.push_back(source);
    }
    return sources;
}

} // namespace rille::engine
