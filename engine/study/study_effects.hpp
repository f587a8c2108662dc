// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/effects.hpp"
#include "engine/study/results.hpp"

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// The curve that is asked for as columns of a table of results.
struct AnswerColumns {
    std::optional<std::size_t> y, x, line; ///< empty: none
};
AnswerColumns answer_columns(const StudyTable&, const Study&);

/// What the results say about every axis, and about the curve that is asked for.
struct StudyEffects {
    std::vector<std::pair<std::size_t, Effects>> metrics; ///< column of the table; the answer first
    std::vector<ResponseFit> fits;                        ///< line by line of the answer
    std::string no_fits; ///< why there are none; empty where there are
};

/// Uses points that are done: one that was not cleared or is clogged tells a bound only. Axes are
/// inputs that are neither linked nor seeds; tables of more than 20000 rows are judged by the
/// answer alone.
StudyEffects study_effects(const StudyTable&, const AnswerColumns&);

nlohmann::json effects_json(const StudyTable&, const StudyEffects&);
/// One row a number: index, span, means over levels, coefficients.
std::string effects_csv(const StudyTable&, const StudyEffects&);
/// Reads DIR/results.csv and writes DIR/effects.json and DIR/effects.csv. Throws OutputError.
void write_study_effects(const std::string& folder, const Study&);

} // namespace rille::engine
