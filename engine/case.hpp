// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/measured.hpp"
#include "engine/open_parameter.hpp"
#include "engine/plasma.hpp"
#include "engine/start_contour.hpp"
#include "fluxes/mechanism.hpp"
#include "geometry/domain.hpp"
#include "geometry/fold.hpp"
#include "geometry/initial_shape.hpp"
#include "geometry/stack.hpp"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// A height named in the file: "10 nm below gate top", "middle of gate".
struct Place {
    std::string text; ///< as written
    double z = 0;     ///< [nm]
};

struct StepEnd {
    enum class Kind { time, share_of_step, reaches, cleared };
    Kind kind = Kind::time;
    double time_s = 0;   ///< kind time
    double share = 0;    ///< kind share_of_step: 0.3 = 30 %
    std::string of_step; ///< kind share_of_step
    std::string film;    ///< kind reaches, cleared: film touched or exposed
    std::string at;      ///< opening's name, or "open field"
};
struct RecipeStep {
    std::string name;
    std::string plasma;
    StepEnd end;
    double no_longer_than_s = 0; ///< for reaches and cleared
    bool must_end = false;       ///< true: hitting no_longer_than is an error (status 4)
};

/// A stated range: at least, at most, a to b. Lengths in nm, angles in deg.
struct Target {
    std::string metric; ///< "bottom cd", "bow", "mask left"
    std::optional<double> at_least, at_most;
    std::string text;  ///< as written
    std::string after; ///< recipe step at whose end it is due; empty: at the end of the run
};

/// A file that the case names (chemistry, ion table), as it was when the case was read.
struct InputFile {
    std::string path;    ///< absolute
    std::string name;    ///< what a run calls its copy: "inputs/analyser.csv"
    std::string content; ///< the whole file
};

/// Everything that a case file says, checked and in inside units (nm, s, eV, K, nm^-2 s^-1).
struct Case {
    std::string title;
    std::string file; ///< path of the case file
    geometry::Domain domain;
    /// How `domain` lies in the period that the file means, in a part of it (symmetric_part.hpp).
    geometry::Fold fold;
    double spacing_asked = 0;           ///< [nm] before rounding to a whole number of cells
    double accuracy_cd_nm = 0;          ///< error that CDs may have; 0 = the spacing is given
    bool assess_grid_error = false;     ///< by companion runs on coarser grids
    std::vector<std::string> materials; ///< the run's material list; ids are indices
    std::vector<char> insulator;        ///< per material: 1 = electrical insulator
    std::vector<geometry::Film> films;  ///< mask first if there is one
    int substrate_first = 0;            ///< index of the first film below the mask in `films`
    geometry::MaskShape mask;
    std::string mask_material;         ///< empty without a mask
    std::optional<StartContour> start; ///< the front at the start; none: mask and stack as drawn
    double liner_thickness = 0;        ///< [nm] conformal film at the start, 0 = none
    int liner_material = -1;
    std::map<std::string, Plasma> plasmas;
    std::string chemistry;                         ///< name, or name of its file
    fluxes::Mechanism mechanism;                   ///< loaded for `materials`
    std::vector<fluxes::IonReflection> reflection; ///< per material
    /// How many parameters of the mechanism are of each standing.
    std::map<fluxes::Standing, int> standing;
    /// Those of the chemistry that are illustrative or from memory: what results stand on.
    std::vector<OpenParameter> open_parameters;
    double wafer_temperature_k = 300;
    std::vector<RecipeStep> steps;
    std::map<std::string, Place> cd_places; ///< "top", "middle", "bottom"
    double frame_interval_s = 0;            ///< how often a frame is written; 0 = 10 frames a run
    std::vector<double> arc_data_s; ///< times at which arrivals along the surface are written
    std::vector<Target> targets;
    MeasuredData measured;             ///< what the result is compared with
    std::vector<std::string> tool_log; ///< "key: value" kept with the result, not used
    std::uint64_t seed = 1;
    int rays_per_element = 64;
    int ions_per_species = 8192;
    double refresh_move = 0.5; ///< [cells] arrivals are renewed after this movement of the front,
    double refresh_change =
        0.02;                  ///< or after about this relative change of the rates that they make
    std::string resolved_yaml; ///< the case as understood, every default filled in
    std::vector<std::string> warnings;
    /// What resolved_yaml names by the names of its copies, so that it can be run again from the
    /// folder that a run leaves.
    std::vector<InputFile> inputs;
    std::string shown_yaml; ///< resolved_yaml with the absolute paths of named files
};

} // namespace rille::engine
