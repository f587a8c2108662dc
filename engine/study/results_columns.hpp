// SPDX-License-Identifier: Apache-2.0
#pragma once

// The columns of results.csv and the lines above them; used by results_write.cpp and results.cpp.

#include "engine/study/results.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// `several`: the case has more than one opening, so that names say which.
StudyTableColumn metric_column(const std::string& metric, const std::string& feature,
                               const std::string& unit, bool several,
                               const std::string& definition);
StudyTableColumn error_column(const StudyTableColumn& metric, bool several);
StudyTableColumn grid_bound_column(const StudyTableColumn& metric, bool several);
StudyTableColumn target_column(const std::string& metric, const std::string& feature, bool several);

/// All columns in their order: point, status, inputs, metrics with their errors, grid error,
/// targets, standing of the parameters, warnings, failure, seconds.
std::vector<StudyTableColumn> all_columns(const Study&,
                                          const std::vector<StudyTableColumn>& metrics,
                                          const std::vector<StudyTableColumn>& targets);

/// The lines that start with # and the line of names.
std::string header_text(const Study&, const std::vector<StudyTableColumn>&,
                        const std::vector<std::string>& warnings);
/// Takes one line that starts with # into the table. Columns come as they stand in the lines
/// "# column".
void read_header_line(const std::string& line, StudyTable&);

} // namespace rille::engine
