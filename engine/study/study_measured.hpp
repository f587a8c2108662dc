// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/results.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// A measured row beside a point that has the same values.
struct MeasuredPoint {
    std::size_t point = 0;              ///< index
    int line = 0;                       ///< of the table
    double value = 0;                   ///< as the table has it
    std::optional<double> sigma, sites; ///< where the table names them
};

struct MeasuredJoin {
    std::vector<MeasuredPoint> rows;    ///< in the order of the table, then of the points
    std::vector<std::string> unmatched; ///< "split.csv:4: no point with amplitude 250 V"
};

/// Joins the rows of the study's comparison to its points by the columns it names: words by their
/// letters, numbers within its relative tolerance. A row may meet several points (repeats). Empty
/// without a comparison. Throws InputError for a table that has changed since the study was read.
MeasuredJoin join_measured(const Study&);

/// A row for each measured row and point that it meets, with what the table predicts there; rows
/// that meet no point as `# unmatched` lines. Values are taken to be in the unit of the answer.
std::string measured_csv(const Study&, const StudyTable&);
/// Writes DIR/measured.csv by DIR/results.csv; nothing without a comparison. Throws OutputError.
void write_measured(const std::string& folder, const Study&);

} // namespace rille::engine
