// SPDX-License-Identifier: Apache-2.0
#include "engine/sources.hpp"

namespace rille::engine {
namespace {

/// An imported table where the plasma has one; else free fall through the sheath: the ions gain
/// the mean sheath voltage plus the presheath's Te/2 and keep their transverse temperature.
fluxes::IonDistribution distribution_of(const Plasma& plasma, const std::string& ion) {
    for (const std::string& key : {ion, std::string()}) {
        const auto table = plasma.ion_energies.find(key);
        if (table != plasma.ion_energies.end()) return table->second;
    }
    return fluxes::IonDistribution::thermal_fall(
        plasma.mean_sheath_voltage + 0.5 * plasma.electron_temperature_ev,
        plasma.ion_transverse_temperature_ev, plasma.ion_transverse_temperature_ev);
}

} // namespace

fluxes::Sources sources_of(const Case& the_case, const Plasma& plasma) {
    fluxes::Sources sources;
    sources.wafer_temperature_k = the_case.wafer_temperature_k;
    for (const std::string& name : the_case.mechanism.ions) {
        fluxes::IonSource source;
        source.name = name;
        for (const PlasmaIon& ion : plasma.ions)
            if (ion.name == name) {
                source.mass_amu = ion.mass_amu;
                source.flux = plasma.ion_flux * ion.share;
                source.distribution = distribution_of(plasma, name);
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
