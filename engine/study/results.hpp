// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/study.hpp"

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rille::engine {

/// One column of results.csv.
struct StudyTableColumn {
    enum class Role {
        point,      ///< name of the point, "0001"
        status,     ///< one of study_names::done ... killed
        input,      ///< what the study varies
        metric,     ///< what was measured
        error,      ///< 95 % sampling error of the metric in the column before
        grid_bound, ///< bound on the grid error of a metric, where it was assessed
        grid_error, ///< words: assessed or not
        target,     ///< "met", "missed" or "undecided"
        standing,   ///< number of parameters of one standing
        warnings,   ///< how many
        failure,    ///< why a point failed or was killed
        seconds     ///< computing time
    };
    Role role = Role::point;
    std::string name;  ///< as in the header: "bottom_cd_of_trench_nm"
    std::string label; ///< input: "amplitude"; metric, error and target: "bottom cd"; else the name
    std::string feature;    ///< opening that a metric, an error or a target belongs to
    std::string unit;       ///< "nm"; "1" = a number without unit; "" = words
    std::string definition; ///< of a metric
    std::string path;       ///< of an input: "plasmas.main.rf_bias.amplitude"
    bool is_linked = false, is_logarithmic = false; ///< of an input
};

/// results.csv in memory: texts as they stand in the file, packed; numbers are read when asked for.
/// Points that failed or were killed have inputs but no metrics.
class StudyTable {
public:
    std::string folder;
    std::string title;
    std::vector<std::string> constants; ///< what stays as in the base case
    std::vector<std::string> warnings;  ///< of the study and of putting the results together
    std::vector<StudyTableColumn> columns;

    std::size_t rows() const { return columns.empty() ? 0 : ends_.size() / columns.size(); }
    /// The cell as text, quotes taken off; empty where there is nothing.
    std::string_view text(std::size_t row, std::size_t column) const;
    /// The cell as a number; nothing for an empty cell or words.
    std::optional<double> number(std::size_t row, std::size_t column) const;

    /// Index of the column of that name in the header.
    std::optional<std::size_t> find(const std::string& name) const;
    /// Index of the only column of a role: status, failure, seconds ...
    std::optional<std::size_t> find(StudyTableColumn::Role role) const;
    /// Indices of all columns of a role, in order: inputs are in the order of Study::columns.
    std::vector<std::size_t> all(StudyTableColumn::Role role) const;
    /// Index of a metric ("bottom cd_loss"); of the first opening that has it where `feature` is
    /// empty.
    std::optional<std::size_t> metric(const std::string& name,
                                      const std::string& feature = "") const;
    /// Index of the sampling error of a metric column.
    std::optional<std::size_t> error_of(std::size_t metric_column) const;

    void add_cell(std::string_view text); ///< used by the reader: row by row

private:
    std::string cells_;
    std::vector<std::size_t> ends_; ///< of each cell in cells_, row by row
};

/// Reads DIR/results.csv. Throws OutputError where there is none or it is damaged.
StudyTable read_study_table(const std::string& folder);

/// How many points ended in which way.
struct StudyCounts {
    std::size_t points = 0; ///< of the plan
    std::size_t done = 0, not_cleared = 0, clogged = 0, failed = 0, killed = 0;
    std::size_t finished() const { return done + not_cleared + clogged + failed + killed; }
    std::size_t missing() const { return points - finished(); }
};

/// A point without result, with what became of it.
struct StudyFailure {
    std::string point, status, failure;
};

/// What putting the results together has found.
struct StudyResults {
    StudyCounts counts;
    std::vector<StudyFailure> failures; ///< the first ten
    std::vector<std::string> warnings;  ///< points made on different kinds of processors
};

/// Writes DIR/results.csv from the folders of the points, in one pass over them. Throws
/// OutputError.
StudyResults write_study_results(const std::string& folder, const Study&);

} // namespace rille::engine
