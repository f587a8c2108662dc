// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/causes.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/ion_tables.hpp"
#include "fluxes/ions.hpp"
#include "fluxes/materials_in_reach.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/rates.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <memory>
#include <string>
#include <vector>

namespace rille::fluxes {

class IonTables;

/// Fast neutrals that an ion species left behind in the sheath: they act by its tallies.
struct FastNeutrals {
    int ion = 0; ///< index into Mechanism::ions
    IonSource source;
};

/// What the plasma sends and how finely it is followed.
struct Sources {
    std::vector<IonSource> ions;         ///< in the order of Mechanism::ions
    std::vector<NeutralSource> neutrals; ///< in the order of Mechanism::neutrals
    double wafer_temperature_k = 300;
    std::vector<FastNeutrals> fast_neutrals;
};
struct Sampling {
    int rays_per_element = 64;
    int ions_per_species = 8192;
    int ion_directions = 64;
    std::uint64_t seed = 1;
    std::uint64_t refresh = 0;
    bool causes = false;   ///< SurfaceStep::cause and supply are filled
    bool detailed = false; ///< these and SurfaceStep::detail are filled
};

/// What lies behind a step, path by path and batch by batch, for the asking.
struct SurfaceDetail {
    int tallies = 0;
    /// [(element * ion_paths + path) * tallies + m] [nm^-2 s^-1], at the element's normal.
    std::vector<double> by_path;
    std::vector<std::vector<double>> by_path_batch;              ///< [batch]: the same of one batch
    std::vector<std::vector<std::vector<double>>> neutral_batch; ///< [batch][species][element]
    std::vector<CauseFields> cause_batch;                        ///< [batch][cause][element]
};

/// Everything about one surface at one instant. Vectors over elements unless said otherwise.
struct SurfaceStep {
    geometry::NormalRates rates;
    std::vector<SurfaceResponse> response; ///< of the outermost material, at the element's normal
    std::vector<std::vector<double>> neutral;  ///< [species][element] impinging flux [nm^-2 s^-1]
    std::vector<std::vector<double>> ion_flux; ///< [species][element] direct, [nm^-2 s^-1]
    /// [species][element] direct fast neutrals of that ion; empty for an ion without any.
    std::vector<std::vector<double>> fast_neutral_flux;
    /// Empty unless asked for: parts of the rate of the outermost material, cause_rates(),
    /// and supply_rates() of the same: paths of ions, then neutral species.
    CauseFields cause, supply;
    std::shared_ptr<const SurfaceDetail> detail; ///< null unless Sampling::detailed
    /// rate_batch[b][e]: the rate had only batch b been used; their spread is the sampling error.
    std::vector<std::vector<double>> rate_batch;
    /// Film material that grows on the element, or, of by-products, would grow at a normal that
    /// ions strike less; or -1.
    std::vector<int> growth_material;
    /// Ion tables of the plasma state: the next step with the same ions takes them from here.
    std::shared_ptr<const IonTables> ion_tables;
    int iterations = 0;  ///< of transport and kinetics against each other
    double residual = 0; ///< largest change of a sticking probability in the last one
    /// Why neutrals were exchanged by rays, with sampling error, where the symmetry allows an exact
    /// exchange; empty where that was done.
    std::string inexact;
    /// Wall time [s] of the solve, part by part; `kinetics` also tabulates the rates.
    struct Seconds {
        double direct_ions = 0, reflected_ions = 0, neutrals = 0, kinetics = 0;
    };
    Seconds seconds;
};

/// Transport and kinetics iterated to convergence of every sticking probability (1e-6), throws
/// NumericsError if that fails. `previous` (may be null) warm-starts when sizes agree.
SurfaceStep solve_surface(const geometry::Domain&, const geometry::Surface&,
                          const geometry::RayCaster&, const MaterialsInReach&, const Mechanism&,
                          const std::vector<IonReflection>& reflection, const Sources&,
                          const Sampling&, const SurfaceStep* previous);

} // namespace rille::fluxes
