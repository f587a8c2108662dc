// SPDX-License-Identifier: Apache-2.0
// A study as its page sees it: the table of its points, its axes and what is asked.
#pragma once

#include "engine/report/chart.hpp"
#include "engine/study/results.hpp"

#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// An input of a study with the values that its points have.
struct StudyAxis {
    std::size_t column = 0; ///< of the table
    std::string title;      ///< "rf_bias amplitude" as a person reads it
    std::string unit;       ///< "V"; empty for words and plain numbers
    bool is_linked = false, is_seed = false, is_logarithmic = false, has_numbers = false;
    /// Distinct values, numbers rising, words as they first come.
    std::vector<std::string> labels; ///< "300", rounded as far as they stay apart
    std::vector<double> numbers;     ///< of has_numbers
    std::vector<std::size_t> level;  ///< of each row: index into labels

    /// "300 V"
    std::string value_text(std::size_t level_index) const;
    /// Varied freely: neither linked to another nor a repeat, and more than one value.
    bool is_free() const { return !is_linked && !is_seed && labels.size() > 1; }
    /// As the axis of a chart, and where a row stands on it.
    ChartAxis chart_axis() const;
    double place(std::size_t row) const {
        return has_numbers ? numbers[level[row]] : static_cast<double>(level[row]);
    }
};

/// Rows of the table with equal values in everything but two axes (and repeats).
struct StudySlice {
    std::string name; ///< "pressure 10 mTorr"; empty where there is one slice
    std::vector<std::size_t> rows;
};

struct StudyView {
    StudyTable table;        ///< with the folder that it lies in
    nlohmann::json manifest; ///< study.json; null where it is missing
    std::string title, plan;
    std::size_t planned = 0; ///< points of the plan
    StudyCounts counts;
    std::vector<StudyAxis> axes;           ///< in the order of the study's columns
    std::optional<std::size_t> y, y_error; ///< columns of the table; empty: nothing is asked
    std::optional<std::size_t> x, line;    ///< indices into axes
    std::string caution;                   ///< one line with the standing of the parameters

    std::string status(std::size_t row) const;
    std::string point(std::size_t row) const;
    /// A result that is a bound only, or of a closed opening.
    bool is_open(std::size_t row) const;
    bool has_result(std::size_t row) const; ///< neither failed nor killed
    /// "bottom CD loss"; "bottom CD loss of line" where the case has several openings.
    std::string metric_name(std::size_t metric_column) const;
    std::string y_title() const;
    std::string y_unit() const;
    double error(std::size_t row, std::size_t metric_column) const; ///< 0 where there is none
    /// "4.1 ± 0.2"; empty where there is no value.
    std::string value_text(std::size_t row, std::size_t metric_column) const;
    /// "0003 · 300 V, 30 nm: 4.1 ± 0.2 nm, not cleared"
    std::string words(std::size_t row) const;
    /// Head and foot of a figure of this study.
    FigureText figure_text(const std::string& id, const std::string& figure_title) const;
};

/// Reads DIR/study.json and DIR/results.csv. A study without results has an empty table. Throws
/// OutputError where neither is there or one is damaged.
StudyView read_study_view(const std::string& folder);

/// The slices of a plan: one for each combination of the free axes that are not among `shown`.
/// Empty where the plan is no grid in them, or has more than `most`.
std::vector<StudySlice> study_slices(const StudyView&, const std::vector<std::size_t>& shown,
                                     std::size_t most);
/// All rows as one slice.
StudySlice whole_study(const StudyView&);

/// "bottom cd_loss" as a person reads it: "bottom CD loss".
std::string metric_title(const std::string& label);
/// "nm" as written after a number: " nm", "°", "".
std::string unit_suffix(const std::string& unit);

} // namespace rille::engine
