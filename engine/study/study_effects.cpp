// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_effects.hpp"

#include "engine/study/study_names.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

namespace rille::engine {

namespace {

using Role = StudyTableColumn::Role;

constexpr std::size_t most_rows_for_all = 20000;

bool is_done(const StudyTable& table, std::size_t row) {
    const auto status = table.find(Role::status);
    return !status || table.text(row, *status) == study_names::done;
}

bool is_free(const StudyTableColumn& column) {
    return column.role == Role::input && !column.is_linked && column.path != "sampling.seed";
}

/// Numbers as they are; words by the order in which they first come.
double level_of(const StudyTable& table, std::size_t row, std::size_t column, EffectAxis& axis) {
    if (!table.columns[column].unit.empty()) return table.number(row, column).value_or(0);
    const std::string word(table.text(row, column));
    const auto found = std::find(axis.words.begin(), axis.words.end(), word);
    const auto index = static_cast<double>(found - axis.words.begin());
    if (found == axis.words.end()) axis.words.push_back(word);
    return index;
}

EffectData data_of(const StudyTable& table, std::size_t metric) {
    EffectData data;
    data.response = table.columns[metric].label;
    if (!table.columns[metric].feature.empty())
        data.response += " of " + table.columns[metric].feature;
    data.unit = table.columns[metric].unit;
    std::vector<std::size_t> inputs;
    for (std::size_t c = 0; c < table.columns.size(); ++c) {
        if (!is_free(table.columns[c])) continue;
        inputs.push_back(c);
        EffectAxis axis;
        axis.label = table.columns[c].label;
        axis.unit = table.columns[c].unit;
        data.axes.push_back(std::move(axis));
    }
    const auto error = table.error_of(metric);
    for (std::size_t row = 0; row < table.rows(); ++row) {
        const auto y = table.number(row, metric);
        if (!y || !std::isfinite(*y) || !is_done(table, row)) {
            ++data.left_out;
            continue;
        }
        data.y.push_back(*y);
        data.error.push_back(error ? table.number(row, *error).value_or(0) : 0);
        for (std::size_t a = 0; a < inputs.size(); ++a)
            data.axes[a].values.push_back(level_of(table, row, inputs[a], data.axes[a]));
    }
    return data;
}

struct Line {
    std::vector<double> x, y, error;
};

void add_fits(const StudyTable& table, const AnswerColumns& answer, StudyEffects& result) {
    if (!answer.y || !answer.x || table.columns[*answer.x].unit.empty()) {
        result.no_fits = "no curve over numbers is asked for";
        return;
    }
    for (std::size_t c = 0; c < table.columns.size(); ++c)
        if (is_free(table.columns[c]) && c != *answer.x && c != answer.line.value_or(*answer.x)) {
            result.no_fits =
                fmt::format("{} varies along each line as well", table.columns[c].label);
            return;
        }
    std::vector<std::string> names; // in the order of the table
    std::map<std::string, Line> lines;
    const auto error = table.error_of(*answer.y);
    for (std::size_t row = 0; row < table.rows(); ++row) {
        const auto x = table.number(row, *answer.x), y = table.number(row, *answer.y);
        if (!x || !y || !is_done(table, row)) continue;
        std::string name;
        if (answer.line) {
            const StudyTableColumn& column = table.columns[*answer.line];
            name = fmt::format("{} {}", column.label, table.text(row, *answer.line));
            if (!column.unit.empty() && column.unit != "1") name += " " + column.unit;
        }
        if (!lines.count(name)) names.push_back(name);
        Line& line = lines[name];
        line.x.push_back(*x);
        line.y.push_back(*y);
        line.error.push_back(error ? table.number(row, *error).value_or(0) : 0);
    }
    for (const std::string& name : names)
        result.fits.push_back(fit_response(name, lines[name].x, lines[name].y, lines[name].error));
    if (names.empty()) result.no_fits = "no point has a value";
}

std::optional<std::size_t> input_column(const StudyTable& table, const Study& study,
                                        std::optional<std::size_t> index) {
    const std::vector<std::size_t> inputs = table.all(Role::input);
    if (!index || *index >= study.columns.size() || *index >= inputs.size()) return std::nullopt;
    return inputs[*index];
}

} // namespace

AnswerColumns answer_columns(const StudyTable& table, const Study& study) {
    AnswerColumns columns;
    if (study.answer.y.empty()) return columns;
    columns.y = table.metric(study.answer.y, study.answer.feature);
    columns.x = input_column(table, study, study.answer.x);
    columns.line = input_column(table, study, study.answer.line_per);
    return columns;
}

StudyEffects study_effects(const StudyTable& table, const AnswerColumns& answer) {
    StudyEffects result;
    std::vector<std::size_t> metrics;
    if (answer.y) metrics.push_back(*answer.y);
    if (table.rows() <= most_rows_for_all)
        for (const std::size_t column : table.all(Role::metric))
            if (column != answer.y) metrics.push_back(column);
    for (const std::size_t column : metrics)
        result.metrics.emplace_back(column, effects_of(data_of(table, column)));
    add_fits(table, answer, result);
    return result;
}

} // namespace rille::engine
