// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/yields.hpp"

#include <array>
#include <string>
#include <vector>

namespace rille::fluxes {

/// A mechanism may use at most this many neutral species and surface coverages.
constexpr int max_species = 8;

/// One linear tally of an ion species: transport returns, at every surface element, the sum over
/// the ions that arrive of the yield. [nm^-2 s^-1]
struct Tally {
    int ion = 0; ///< index into Mechanism::ions
    YieldFunction yield;
};

/// How far a number can be trusted.
enum class Standing { measured, published, from_memory, illustrative };

/// How ions leave a wall they hit at grazing incidence.
struct IonReflection {
    double critical_deg = 60; ///< below: no reflection
    double exponent = 1;      ///< probability ((theta - critical)/(90 - critical))^exponent
    double probability = 1;   ///< at grazing incidence
    int collisions = 2;       ///< equal deflections of the binary-collision energy loss; 0 = none
    double target_mass_amu = 28; ///< mass of a surface atom
    double scatter_deg = 5;      ///< Gaussian scatter about the specular direction
};

struct SurfaceChemistry; // one material's processes: surface_chemistry.hpp

/// What ions and neutrals do to every material of a run. Linear in the ion tallies' inputs;
/// built from a chemistry file and the material list of the case.
struct Mechanism {
    std::string name;
    std::vector<std::string> ions;
    std::vector<std::string> neutrals; ///< at most max_species
    /// Per neutral: n of the law cos^n about the normal by which surfaces give it off as a
    /// by-product; 0 where none does. Empty: no by-products at all.
    std::vector<double> cosine_power;
    std::vector<Tally> tallies;
    std::vector<SurfaceChemistry> surfaces; ///< index = material id of the run

    Mechanism();
    ~Mechanism();
    Mechanism(const Mechanism&);
    Mechanism& operator=(const Mechanism&);
    Mechanism(Mechanism&&) noexcept;
    Mechanism& operator=(Mechanism&&) noexcept;

    bool gives_off(std::size_t neutral) const {
        return neutral < cosine_power.size() && cosine_power[neutral] > 0;
    }
};

/// What arrives at one place. Pointers are valid for the call only.
struct LocalArrivals {
    const double* tallies = nullptr;  ///< Mechanism::tallies.size() values [nm^-2 s^-1]
    const double* neutrals = nullptr; ///< impinging, Mechanism::neutrals.size() values [nm^-2 s^-1]
    double temperature_k = 300;       ///< of the wafer surface
};

/// What the surface does there, in steady state.
struct SurfaceResponse {
    double rate = 0;         ///< [nm/s] > 0 etching, < 0 growth of grown_material
    int grown_material = -1; ///< material id of the film that grows, or -1
    int settling_material =
        -1; ///< film that most of the returning by-products would build up, or -1
    std::array<double, max_species>
        sticking{}; ///< probability that an impinging neutral stays, [0, 1]
    std::array<double, max_species> emitted{};  ///< by-products given off [nm^-2 s^-1]
    std::array<double, max_species> coverage{}; ///< per coverage of the material, [0, 1]
    double by_ion_enhanced = 0;                 ///< parts of the rate [nm/s]
    double by_sputtering = 0;
    double by_spontaneous = 0;
    double by_deposition = 0; ///< <= 0
    double bare = 1;          ///< share of the surface without adsorbates
    double outside_films = 1; ///< share of the surface outside grown films
};

SurfaceResponse respond(const Mechanism&, int material, const LocalArrivals&);

} // namespace rille::fluxes
