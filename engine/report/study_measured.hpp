// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/report/study_view.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// A measured row that lies beside points of a study.
struct MeasuredRow {
    std::vector<std::size_t> rows; ///< of the table: points with the same values
    double value = 0;
    std::optional<double> sigma; ///< spread over sites
    std::optional<double> sites;
};

/// The rows of the study's comparison, joined to its points by values within its tolerance. A row
/// that no point fits is left out and counted in `unmatched`.
struct MeasuredRows {
    std::vector<MeasuredRow> rows;
    std::size_t unmatched = 0;
    std::string problem; ///< why there are none though the study names them
};
MeasuredRows measured_rows(const StudyView&);

} // namespace rille::engine
