// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_plan.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

namespace {

constexpr std::size_t most_shown = 12;

std::string along(const Axis& axis) {
    if (axis.is_drawn)
        return fmt::format("{} to {}{}, drawn", axis.values[0].text, axis.values[1].text,
                           axis.is_log ? " (log)" : "");
    const std::size_t count = axis.values.size();
    std::string text = axis.values[0].text;
    for (std::size_t v = 1; v < count; ++v)
        if (v < most_shown - 1 || v + 1 == count)
            text += ", " + axis.values[v].text;
        else if (v + 2 == count)
            text += ", ...";
    return count > 1 ? fmt::format("{} ({} values)", text, count) : text;
}

} // namespace

std::string plan_text(const Study& study) {
    const Study::Plan& plan = *study.design;
    std::size_t width = 0;
    for (const StudyColumn& column : study.columns)
        width = std::max(width, column.label.size());
    std::string text =
        fmt::format("{}\nbase case: {}\nplan: {}, {} {}\n", study.title, study.base_file,
                    study.plan, study.points, study.points == 1 ? "run" : "runs");
    const auto line = [&](const StudyColumn& column, const std::string& values) {
        text += fmt::format("  {:<{}}  {}\n", column.label, width, values);
    };
    for (const Axis& axis : plan.axes)
        line(study.columns[axis.column], along(axis));
    for (const LinkedColumn& link : plan.linked)
        line(study.columns[link.column], study.columns[link.column].follows);
    if (!plan.seeds.empty())
        for (const StudyColumn& column : study.columns)
            if (column.path == "sampling.seed")
                line(column, fmt::format("{} to {}: {} repeats of every point", plan.seeds.front(),
                                         plan.seeds.back(), plan.seeds.size()));
    for (const std::string& constant : study.constants)
        text += "constant: " + constant + "\n";
    for (const std::string& warning : study.warnings)
        text += "warning: " + warning + "\n";
    return text;
}

} // namespace rille::engine
