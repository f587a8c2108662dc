// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"

#include <limits>
#include <string>
#include <variant>
#include <vector>

namespace rille::fluxes {

/// value exp(-Ea/k (1/T - 1/Tref)): `value` holds at the reference temperature, and is the
/// prefactor itself where that is infinite (the default).
struct Arrhenius {
    double value = 0;
    double activation_ev = 0;
    double reference_k = std::numeric_limits<double>::infinity();
    double at(double temperature_k) const;
};

/// The part of the surface on which a process runs. `whole` leaves out what lies under a film that
/// a Deposition builds up.
struct SurfacePart {
    enum class Kind { whole, bare, covered };
    Kind kind = Kind::whole;
    int coverage = -1; ///< for covered
};

/// Indices into Mechanism::tallies whose sum drives an ion process [nm^-2 s^-1].
using Tallies = std::vector<int>;

/// A by-product that a process gives off with what it removes.
struct Leaving {
    int neutral = 0;
    double per_unit = 1; ///< of it for each unit removed
};
using Leavings = std::vector<Leaving>;

/// Multiplies a sticking probability by 1 + eta * (sum of tallies), at most to 1.
struct IonAssistance {
    double eta = 0; ///< [nm^2 s]
    Tallies tallies;
};

/// An impinging neutral sticks on bare sites and fills `atoms` of them.
struct Adsorption {
    int neutral = 0;
    int coverage = 0;
    double sticking = 0; ///< on a bare site
    double atoms = 1;
    IonAssistance assistance;
};
/// Ions leave atoms of their own on bare sites; the tallies count those atoms.
struct IonAdsorption {
    int coverage = 0;
    Tallies tallies;
};
/// Adsorbed atoms leave by heat: flux from a fully covered surface [nm^-2 s^-1].
struct Desorption {
    int coverage = 0;
    Arrhenius flux;
};
/// Impinging atoms of `neutral` recombine and do not come back as that species.
struct Recombination {
    int neutral = 0;
    Arrhenius probability;
    SurfacePart on;
};
/// Ions turn adsorbed atoms and target into a volatile product. The tallies count target units
/// removed from a fully covered surface, each taking `atoms` adsorbed atoms along.
struct IonEnhancedEtching {
    int coverage = 0;
    double atoms = 1;
    Tallies tallies;
    Leavings leaves{};
};
/// Target units sputtered by ions.
struct PhysicalSputtering {
    SurfacePart on;
    Tallies tallies;
    Leavings leaves{};
};
/// An impinging neutral reacts and takes 1 / `atoms` target units along.
struct SpontaneousEtching {
    int neutral = 0;
    Arrhenius probability;
    double atoms = 1;
    SurfacePart on;
    Leavings leaves{};
};
/// Adsorbed atoms react with the target by heat: flux of atoms from a fully covered surface
/// [nm^-2 s^-1]; `atoms` of them take one target unit along.
struct ThermalEtching {
    int coverage = 0;
    Arrhenius flux;
    double atoms = 1;
    Leavings leaves{};
};
/// Ions remove adsorbed atoms (or units of a film) without etching. The tallies count them.
struct IonRemoval {
    int coverage = 0;
    Tallies tallies;
    Leavings leaves{};
};
/// An impinging neutral removes `atoms` adsorbed atoms from where it strikes the coverage.
struct NeutralRemoval {
    int coverage = 0;
    int neutral = 0;
    Arrhenius probability;
    double atoms = 1;
};
/// A neutral sticks where its film is: on sites of `coverage` (one unit of film a site), or on the
/// whole surface where the material is that film itself (coverage -1). While the rest of the
/// mechanism removes more of the film than arrives there is a steady coverage; otherwise the film
/// covers everything and grows at the net rate.
struct Deposition {
    int neutral = 0;
    int coverage = -1;
    double sticking = 0;     ///< on the film
    double film_density = 0; ///< film units [nm^-3]
    int film_material = -1;  ///< id in the run's material list
    IonAssistance assistance;
};

/// Ions that take a redeposited film away again: the tallies count its units.
struct FilmRemoval {
    Tallies tallies;
    Leavings leaves;
};
/// A neutral that sticks on any site and builds up as a film of another material. While ions remove
/// more than arrives, films cover the shares (arriving / removed from a fully covered surface) and
/// leave the rest to the other processes; otherwise they cover everything and grow, mixed as they
/// pile up: each covers arriving / (g + removed), where the sum of those shares, 1, gives the net
/// growth g in units. Source: balance of atoms, derived here.
struct Redeposition {
    int neutral = 0;
    int coverage = 0;
    double sticking = 0;
    double film_density = 0; ///< film units [nm^-3]
    int film_material = -1;  ///< id in the run's material list
    std::vector<FilmRemoval> removal;
};

using SurfaceProcess =
    std::variant<Adsorption, IonAdsorption, Desorption, Recombination, IonEnhancedEtching,
                 PhysicalSputtering, SpontaneousEtching, ThermalEtching, IonRemoval, NeutralRemoval,
                 Deposition, Redeposition>;

/// One material: adsorbates compete for one lattice of sites in quasi-steady balance,
///   (gain_j) theta_0 = (loss_j) theta_j,   theta_0 = 1 - sum theta_j,
/// with gain and loss [nm^-2 s^-1] the sums over the processes. A material without processes is
/// not etched and re-emits every neutral.
struct SurfaceChemistry {
    std::string material;
    double density = 1;                 ///< target units [nm^-3]
    std::vector<std::string> coverages; ///< adsorbates, at most max_species
    std::vector<SurfaceProcess> processes;
};

/// Material ids of the films that the mechanism can build up, ascending, each once.
std::vector<int> deposited_materials(const Mechanism&);
/// Those of them that by-products build up, by Redeposition or on the film itself.
std::vector<int> redeposited_materials(const Mechanism&);

} // namespace rille::fluxes
