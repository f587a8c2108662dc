// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// One input that a study changes: a value of the case file, addressed by names.
struct StudyColumn {
    std::string path;       ///< "plasmas.main.rf_bias.amplitude"; "sampling.seed" for repeats
    std::string label;      ///< shortest tail of the path that no other column has: "amplitude"
    std::string unit;       ///< as the values are shown: "V", "nm", "1" = a number; "" = words
    bool is_linked = false; ///< follows another column by a table
    std::string follows;    ///< of a linked column: "follows amplitude by response.csv, row by row
                            ///< within 0.01 %, not interpolated"
    bool is_logarithmic = false; ///< shown on a logarithmic axis
};

/// One value of one point.
struct StudyValue {
    std::string text;             ///< as it would stand in a case file: "300 V"
    std::optional<double> number; ///< in the column's unit; empty for words
};

/// One run of a study.
struct StudyPoint {
    std::size_t index = 0;          ///< from 0
    std::vector<StudyValue> values; ///< one a column
};

/// The curve that is asked for. Empty `y`: none.
struct StudyAnswer {
    std::string y;                       ///< name of a metric: "bottom cd_loss"
    std::string feature;                 ///< opening that y belongs to; empty = the first
    std::size_t x = 0;                   ///< column
    std::optional<std::size_t> line_per; ///< column: one line for each of its values
};

/// Measured rows that are laid beside the points.
struct StudyComparison {
    std::string file;                ///< absolute path of the CSV
    std::vector<std::size_t> join;   ///< columns by whose values rows are joined
    std::string value, sigma, sites; ///< names of its columns; sigma and sites may be empty
    double tolerance = 1e-6;         ///< relative, of joined numbers
};

/// What each point leaves of its run folder.
struct StudyKeep {
    enum class Part { metrics, last_profile, picture, history, frames, everything };
    std::vector<Part> each{Part::metrics, Part::last_profile};
    std::vector<Part> failed{Part::everything};
};

/// How the points are handed to a Slurm cluster.
struct SlurmSettings {
    std::string partition, account, qos, constraint; ///< empty = the cluster's default
    std::optional<double> seconds_per_point;         ///< empty = from the estimate
    std::optional<double> memory_mb;                 ///< per task; empty = from the estimate
    int points_per_task = 1;
    int cpus_per_task = 1;
    int at_most_tasks = 0;          ///< at once; 0 = no limit
    std::vector<std::string> lines; ///< put into the job script as they stand: "module load gcc/12"
    double warn_before_kill_s = 120;
    int retries_killed = 2;
};

/// A study as its file says, checked: a base case, what is changed, and what is asked.
/// Points are made one by one, so that a study of any size takes the memory of its axes.
struct Study {
    std::string title;
    std::string file;      ///< path of the study file
    std::string base_file; ///< path of the base case
    /// The base case, nothing changed. Its `resolved_yaml` is the file as it was written (plasmas
    /// that copy others still do, so that they follow what is varied) with the names of the copies
    /// in `base.inputs`: written as base/case.yaml beside them it gives the same points.
    Case base;
    std::vector<StudyColumn> columns;
    std::size_t points = 0;
    std::string plan; ///< "full grid", "latin hypercube", "sobol", "table"
    StudyAnswer answer;
    std::optional<StudyComparison> comparison;
    StudyKeep keep;
    SlurmSettings slurm;
    /// What stays as in the base case though it would change with what is varied on a tool:
    /// "ion_flux of main stays 1.1 mA/cm2 while pressure changes". Repeated in every output.
    std::vector<std::string> constants;
    std::vector<std::string> warnings;
    std::vector<InputFile> inputs; ///< tables that the study names
    std::string resolved_yaml;     ///< the study as understood; `base` and tables by their copies
    /// Values along each axis, or a table of points: whatever the plan needs to make one.
    struct Plan;
    std::shared_ptr<const Plan> design;
};

/// Reads a study file, its base case and its tables. `overrides` ("key.path=value") change the base
/// case. Throws InputError with every problem found: unknown paths, wrong units, values out of
/// range, more than a million points, names that the answer uses and nothing has.
Study load_study(const std::string& path, const std::vector<std::string>& overrides = {});
/// The same for a study that has been read before, as it lies in its folder: no point is built to
/// see whether it can be, and what ions do in the sheath of the base case is left out. Some 10
/// times faster where points are many or sheaths are slow.
Study reload_study(const std::string& path);

/// Points of a full grid: the last axis changes fastest, repeats faster still. Throws
/// std::out_of_range for an index from `points` on.
StudyPoint study_point(const Study&, std::size_t index);
/// The overrides "key.path=value" that make the base case the case of a point.
std::vector<std::string> point_overrides(const Study&, const StudyPoint&);
/// The case of a point as its run has it, every default filled in: YAML. Throws InputError.
std::string point_case(const Study&, std::size_t index);
/// Name of the folder of a point: "0001" for index 0; as many digits as the last one needs, at
/// least four.
std::string point_name(const Study&, std::size_t index);
/// The plan in words: axes, number of points, what stays constant, warnings.
std::string plan_text(const Study&);

} // namespace rille::engine
