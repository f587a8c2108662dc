// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/by_products.hpp"
#include "engine/materials_file.hpp"
#include "engine/parameters.hpp"
#include "engine/yield_reader.hpp"
#include "fluxes/mechanism.hpp"
#include "fluxes/surface_chemistry.hpp"

#include <map>
#include <set>
#include <string>
#include <vector>

namespace rille::engine {

/// What the processes of a chemistry file may refer to.
struct ChemistryNames {
    std::vector<std::string> ions, neutrals; ///< that the file declares
    std::vector<std::string> by_products;    ///< those neutrals that surfaces give off
    std::vector<std::string> materials;      ///< that the file describes
};

/// Builds the surfaces of a mechanism from the materials of a chemistry file. Processes of species
/// that are not in the mechanism are read, checked and left out.
class ProcessReader {
public:
    /// `run_materials` grows by the films that deposition processes name.
    ProcessReader(const ChemistryNames&, const MaterialsLibrary&, const YamlNode* named_yields,
                  fluxes::Mechanism&, std::vector<std::string>& run_materials, Problems&);

    /// One material: {adsorbates: [...], processes: [...], ion_reflection: {...}}. Changes the
    /// reflection law if the chemistry has its own.
    fluxes::SurfaceChemistry read(const YamlNode&, const MaterialData&, fluxes::IonReflection&);
    /// One entry of the section of by-products: {cosine_power: ..., film: ..., sticking: ...},
    /// or less.
    ByProduct read_by_product(const YamlNode&);
    /// Index of a material of the run, added to the list if it is not there.
    int film_id(const std::string& film);
    const std::map<fluxes::Standing, int>& counts() const { return parameters_.counts(); }
    const std::vector<OpenParameter>& open() const { return parameters_.open(); }

private:
    struct Process;
    void read_process(const YamlNode&, fluxes::SurfaceChemistry&);
    void read_adsorption(Process&);
    void read_ion_adsorption(Process&);
    void read_desorption(Process&);
    void read_recombination(Process&);
    void read_ion_enhanced_etching(Process&);
    void read_physical_sputtering(Process&);
    void read_spontaneous_etching(Process&);
    void read_thermal_etching(Process&);
    void read_ion_removal(Process&);
    void read_neutral_removal(Process&);
    void read_deposition(Process&);

    int adsorbate(Process&);
    int neutral(Process&, bool& in_use);
    fluxes::SurfacePart part(Process&);
    fluxes::Arrhenius arrhenius(const YamlNode*, const ParameterForm&);
    fluxes::Arrhenius surface_flux(Process&);
    fluxes::Tallies yield_tallies(Process&);
    fluxes::Leavings leavings(Process&);
    fluxes::Tallies tallies(const YamlNode* ions, const fluxes::YieldFunction&);
    fluxes::IonAssistance assistance(Process&);
    fluxes::YieldFunction named_yield(const YamlNode&);

    const ChemistryNames& names_;
    const MaterialsLibrary& library_;
    const YamlNode* named_yields_;
    fluxes::Mechanism& mechanism_;
    std::vector<std::string>& run_materials_;
    Problems& problems_;
    ParameterReader parameters_;
    std::map<std::string, fluxes::YieldFunction> yields_;
    std::map<std::vector<double>, int> tally_of_;
    std::set<int> starts_; ///< adsorbates of the material being read on which a film can start
};

} // namespace rille::engine
