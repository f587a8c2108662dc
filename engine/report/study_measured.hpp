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

/// The measured rows that measured.csv lays beside points with a row in the table, and how many
/// meet no point of the plan.
struct MeasuredRows {
    std::vector<MeasuredRow> rows;
    std::size_t unmatched = 0;
    std::string problem; ///< why there are none though the study names them
};
MeasuredRows measured_rows(const StudyView&);

} // namespace rille::engine
