// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"
#include "fluxes/sheath.hpp"

#include <map>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

struct PlasmaNeutral {
    std::string name;
    double flux = 0;    ///< [nm^-2 s^-1]
    double density = 0; ///< [nm^-3]; above 0: the flux follows from it
    double temperature_k = 300;
};
struct PlasmaIon {
    std::string name; ///< as in configs/ions.yaml, "Cl2+"
    double mass_amu = 0;
    double share = 0; ///< of the ion flux, sums to 1 over the list
};
/// A gas between plasma and wafer.
struct PlasmaGas {
    std::string name;
    double density = 0; ///< [nm^-3]
};

/// What drives the sheath above the wafer.
struct Bias {
    enum class Given { nothing, mean_sheath, amplitude, self_bias, power, waveform };
    Given given = Given::nothing;
    double value = 0;                 ///< [V]; of power [W]
    double frequency_hz = 0;          ///< 0 = steady
    double power_per_nm2 = 0;         ///< given power: delivered to ions [W/nm2]
    fluxes::Waveform waveform;        ///< given waveform: voltage of the electrode
    std::optional<double> area_ratio; ///< grounded surfaces over wafer electrode
    double area_exponent = 2.5;
};

/// A bias that is switched slowly; while it is off the sheath floats.
struct BiasPulse {
    double frequency_hz = 0;
    double on = 1;           ///< share of the time
    double off_ion_flux = 0; ///< [nm^-2 s^-1]; below 0: as while it is on
    double off_electron_temperature_ev = 0;
};

struct SheathOptions {
    fluxes::SheathEdge edge = fluxes::SheathEdge::fixed;
    bool collisions = true;
    int trajectories = 100000;
};

struct SheathResult;

/// One state of the plasma, as the case file says it.
struct Plasma {
    std::string name;
    double electron_temperature_ev = 3;
    double ion_flux = 0;                ///< all ions; while the bias is on [nm^-2 s^-1]
    double bulk_electron_density = 0;   ///< [nm^-3]; 0 = found from the ion flux
    double edge_to_bulk = 0.60653;      ///< electron density at the sheath edge over the bulk's
    double negative_over_electrons = 0; ///< at the sheath edge
    double negative_temperature_ev = 0;
    bool common_bohm_speed = false;
    std::vector<PlasmaIon> ions;
    double ion_transverse_temperature_ev = 0.1;
    double ion_tilt_deg = 0, ion_azimuth_deg = 0;
    std::optional<double> pressure_pa;
    double gas_temperature_k = 300;
    std::vector<PlasmaGas> gases; ///< empty: not known
    std::vector<PlasmaNeutral> neutrals;
    Bias bias;
    std::optional<BiasPulse> pulse;
    SheathOptions sheath_options;
    std::string cross_sections; ///< path of the file of collisions
    /// Imported energy-angle tables, one per ion name; "" = for every ion.
    std::map<std::string, fluxes::IonDistribution> ion_energies;
    std::vector<std::string> unused; ///< set points that the model does not use, as written
    /// What reaches the wafer; set once the case is complete.
    std::shared_ptr<const SheathResult> arrivals;
};

} // namespace rille::engine
