// SPDX-License-Identifier: Apache-2.0
#include "engine/sources.hpp"

#include "engine/sheath_model.hpp"

namespace rille::engine {

fluxes::Sources sources_of(const Case& the_case, const Plasma& plasma) {
    fluxes::Sources sources;
    // A plasma that no case file made has tables or a steady sheath, which cost nothing.
    const SheathResult arrivals =
        plasma.arrivals ? *plasma.arrivals : solve_sheath(plasma, {}, the_case.seed);
    sources.wafer_temperature_k = the_case.wafer_temperature_k;
    for (const std::string& name : the_case.mechanism.ions) {
        fluxes::IonSource source;
        source.name = name;
        for (const IonAtWafer& ion : arrivals.ions)
            if (ion.name == name) {
                source.mass_amu = ion.mass_amu;
                source.flux = ion.flux;
                source.distribution = ion.ions.front();
                if (ion.fast_neutrals.empty() || !(ion.fast_neutral_flux > 0)) continue;
                // A fast neutral hits like the ion that it was (see IonAtWafer).
                sources.fast_neutrals.push_back(
                    {static_cast<int>(sources.ions.size()),
                     {name, ion.mass_amu, ion.fast_neutral_flux, ion.fast_neutrals.front()}});
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
