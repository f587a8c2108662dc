// SPDX-License-Identifier: Apache-2.0
#pragma once

// What a study is made of between its file and its points; used by the study_*.cpp files only.

#include "engine/case_build.hpp"
#include "engine/csv_rows.hpp"
#include "engine/study/study.hpp"

#include <array>
#include <functional>

namespace rille::engine {

/// A value along an axis.
struct AxisValue {
    YamlNode node;                ///< as it is put into the case file; `at`: where it was written
    std::string text;             ///< as shown: "300 V"; of a file its name
    std::optional<double> number; ///< in the unit of the column
};

/// One thing that is varied: a list of values, or a range from which points are drawn.
struct Axis {
    std::size_t column = 0;
    Location at;
    std::vector<AxisValue> values; ///< list, or range in a full grid; of a drawn range its ends
    bool is_drawn = false;
    bool is_log = false, is_whole = false; ///< of a drawn range: integers
    std::string unit;                      ///< of a range, as it was written
    /// The value at a place of the axis, 0 <= u < 1.
    AxisValue at_share(double u) const;
};

/// A column that follows another one by the rows of a table.
struct LinkedColumn {
    std::size_t column = 0, by = 0;
    std::vector<AxisValue> keys, values; ///< row by row; keys in the unit of column `by`
    bool is_interpolated = false;
    double tolerance = 0;
    std::string unit;
    std::string file; ///< its name, for messages
    /// Nothing if no row fits; `reason` says why.
    std::optional<AxisValue> at(const AxisValue& key, std::string& reason) const;
};

struct Study::Plan {
    enum class Kind { full_grid, latin_hypercube, sobol, table };
    Kind kind = Kind::full_grid;
    std::vector<Axis> axes; ///< of a table: one for each of its columns, values by rows
    std::vector<LinkedColumn> linked;
    std::size_t drawn = 0;            ///< points of a Latin hypercube, of Sobol, rows of a table
    std::uint64_t seed = 1;           ///< of a Latin hypercube
    std::vector<std::uint64_t> seeds; ///< of repeats; empty without
    std::string base_folder;
    YamlNode document; ///< the base case, command-line values applied
    std::string base_name;
};

/// Most points that a study may have.
constexpr double most_study_points = 1000000;

/// Place of a path in a case: the rule of the value, and the value if there is one.
struct PathTarget {
    const Rule* rule = nullptr; ///< nullptr: `error` says why there is none
    const Entry* entry = nullptr;
    std::string error;
};
PathTarget find_path(const Entry& root, const std::string& path);

/// Values as shown, with numbers in one unit. `unit` becomes "" where they are words.
void give_numbers(std::vector<AxisValue>& values, const Rule&, std::string& unit);
/// A number in a unit as a case file has it: "300 V", "5".
YamlNode number_node(double value, const std::string& unit, const Location&);

/// Column of the study that a path, or the end of one, names; a problem if there is none or
/// several fit.
std::optional<std::size_t> find_column(const std::vector<StudyColumn>&, const std::string& name,
                                       const Location&, const std::string& path, Problems&);
/// Labels: the shortest end of each path that no other has.
void label_columns(std::vector<StudyColumn>&);

/// Values of a point, column by column, as they are put into the case file. Values of linked
/// columns that have no row are problems.
std::vector<AxisValue> point_values(const Study&, std::size_t index, Problems* = nullptr);
/// The case of a point; every problem is added. Without arrivals it is cheap.
BuiltCase build_point(const Study&, std::size_t index, bool with_arrivals, Problems&);

/// A study while it is read.
struct StudyReading {
    Study study;
    Study::Plan plan;
    std::string folder;             ///< of the study file
    Entry root;                     ///< of the study file
    Entry base_root;                ///< of the base case
    std::vector<const Rule*> rules; ///< of each column
    bool is_new = true;             ///< not read before: everything is to be checked
    bool has_lost_columns = false;  ///< a path was wrong: what names it is not reported again
    Problems problems;
};

// Steps of the reading, in this order.
void read_base(StudyReading&, const std::vector<std::string>& overrides);
void read_axes(StudyReading&);
void read_points_table(StudyReading&, const Entry& file);
void read_linked(StudyReading&);
void read_answer(StudyReading&);
void read_comparison(StudyReading&);
void read_keep_and_slurm(StudyReading&);
/// Builds cases that hold every value of every axis, without arrivals.
void check_points(StudyReading&);
void list_constants(StudyReading&);
void write_resolved(StudyReading&);

/// Adds a column if the path is one of the case; nothing and a problem otherwise.
std::optional<std::size_t> add_column(StudyReading&, const std::string& path, const Location&);
/// Checks values by the rule of their column.
void check_values(StudyReading&, std::size_t column, std::vector<AxisValue>&);
/// Name and unit of a column of a table: "pressure [mTorr]", or pressure_mTorr as results are
/// written. No unit where the cells hold it themselves.
struct Heading {
    std::string name, unit;
};
Heading heading_of(const std::string& text);
/// Whether a name is a path or its end: "rf_bias.amplitude".
bool ends_path(const std::string& name, const std::string& path);
YamlNode cell_node(const CsvCell&, const std::string& unit);

/// Keeps a file among the inputs of the study, each once; the name of its copy.
std::string keep_input(Study&, const std::string& absolute_path);
/// Absolute path of a table that the study names, kept among its inputs; a problem and nothing if
/// it cannot be read.
std::optional<std::string> keep_table(StudyReading&, const Entry& file);

} // namespace rille::engine
