// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"

#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// A value of a CSV file with its place.
struct CsvCell {
    std::string text; ///< trimmed
    Location at;
};
using CsvRow = std::vector<CsvCell>;

/// A CSV file as written: values between commas, `# key = value` lines kept apart, other lines that
/// start with # and empty lines skipped.
struct CsvRows {
    std::string name; ///< in messages
    std::vector<std::pair<std::string, CsvCell>> header;
    std::vector<CsvRow> rows;
};

CsvRows split_csv(const std::string& text, const std::string& name);
/// A file that cannot be read, or is empty, is a problem; then nothing is returned in it.
CsvRows read_csv(const std::string& path, const std::string& shown, Problems&);

/// A plain number; adds a problem and returns 0 if it is none, or negative without leave.
double csv_number(const CsvCell&, bool may_be_negative, Problems&);

/// Columns of numbers under the column names given, which must stand in the first row in this
/// order. Rows of another width and cells that are no numbers are problems; then nothing is
/// returned.
std::vector<std::vector<double>> csv_columns(const CsvRows&, const std::vector<std::string>& names,
                                             Problems&);

} // namespace rille::engine
