// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/history.hpp"
#include "engine/metric.hpp"
#include "engine/run_record.hpp"
#include "engine/shape_ledger.hpp"
#include "fluxes/surface_step.hpp"
#include "geometry/grown_films.hpp"
#include "geometry/surface.hpp"

#include <exception>
#include <functional>
#include <string>
#include <vector>

namespace rille::engine {

struct Case;

/// One value per surface element, under the name and unit that files show: {"ion_flux",
/// "per_nm2_s"} becomes the column ion_flux_per_nm2_s. Units: nm, nm_per_min, per_nm2_s, deg, 1
/// (dimensionless).
struct NamedField {
    std::string name;
    std::string unit;
    std::vector<double> value;
};

/// The front at one instant with what is known on its elements. Vectors are over the elements of
/// `surface`, or empty where nothing is known yet.
struct SurfaceState {
    double time_s = 0;
    std::string step;
    geometry::Surface surface;
    std::vector<int> material;      ///< outermost material, index into Case::materials
    std::vector<int> film;          ///< film just inside the solid, below grown films: Case::films
    geometry::GrownFilms grown;     ///< films grown during the run or laid at its start
    std::vector<double> rate;       ///< [nm/s], > 0 etching
    std::vector<NamedField> fields; ///< fluxes, coverages, causes
    /// displacement[b][e] [nm]: where batch b alone would have put the element, less where all put
    /// it (either sign convention); 8 batches, or empty where nothing is sampled.
    std::vector<std::vector<double>> displacement;
};

/// Fills material, film, rate and fields of a state from the surface step that was solved on it.
/// `state.surface` and `state.grown` must be set.
void fill_state(SurfaceState& state, const Case&, const fluxes::SurfaceStep&);

/// What a run hands over at its end, finished or interrupted.
struct RunResult {
    SurfaceState last;
    std::vector<HistoryRow> history;
    std::vector<StepMetrics> after; ///< at the ends of the steps that targets name
    std::vector<ShapePart> shape;   ///< what has made it
    RunRecord record;
    std::exception_ptr error; ///< what stopped the run, null unless record.status is "failed"
    /// Writes the level set to the path given; empty = no such file.
    std::function<void(const std::string&)> write_level_set;
};

} // namespace rille::engine
