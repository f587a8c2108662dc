// SPDX-License-Identifier: Apache-2.0
#include "engine/study/results_columns.hpp"

#include "engine/caution.hpp"
#include "engine/number_text.hpp"

#include <algorithm>

namespace rille::engine {
namespace {

using Role = StudyTableColumn::Role;

constexpr std::pair<Role, const char*> role_words[] = {
    {Role::point, "point"},           {Role::status, "status"},   {Role::input, "input"},
    {Role::metric, "metric"},         {Role::error, "error"},     {Role::grid_error, "grid_error"},
    {Role::grid_bound, "grid_bound"}, {Role::target, "target"},   {Role::standing, "standing"},
    {Role::warnings, "warnings"},     {Role::failure, "failure"}, {Role::seconds, "seconds"}};

/// Names of columns hold no dots and no spaces.
std::string name_part(const std::string& text) {
    std::string name = column_name(text);
    std::replace(name.begin(), name.end(), '.', '_');
    return name;
}

std::string with_unit(const std::string& name, const std::string& unit) {
    return unit.empty() || unit == "1" ? name : name + "_" + name_part(unit);
}

std::string of_feature(const std::string& feature, bool several) {
    return several && !feature.empty() ? "_of_" + name_part(feature) : "";
}

StudyTableColumn plain_column(Role role, const std::string& name, const std::string& unit = "") {
    StudyTableColumn column;
    column.role = role;
    column.name = column.label = name;
    column.unit = unit;
    return column;
}

/// The column of what is known about a metric beside its value.
StudyTableColumn beside(const StudyTableColumn& metric, bool several, Role role,
                        const std::string& ending) {
    StudyTableColumn column = metric;
    column.role = role;
    column.name = with_unit(name_part(metric.label) + of_feature(metric.feature, several) + ending,
                            metric.unit);
    column.definition.clear();
    return column;
}

std::string one_line(std::string text) {
    for (char& c : text)
        if (c == '\n' || c == '\r' || c == '|') c = ' ';
    return text;
}

/// "name | role | label | feature | unit | path | linked logarithmic | definition"
std::string column_line(const StudyTableColumn& column) {
    std::string role;
    for (const auto& [key, word] : role_words)
        if (key == column.role) role = word;
    const std::string marks = std::string(column.is_linked ? "linked" : "") +
                              (column.is_linked && column.is_logarithmic ? " " : "") +
                              (column.is_logarithmic ? "logarithmic" : "");
    std::string line = "# column: " + column.name;
    for (const std::string& part :
         {role, column.label, column.feature, column.unit, column.path, marks, column.definition})
        line += " | " + one_line(part);
    return line + "\n";
}

std::vector<std::string> parts_of(const std::string& text) {
    std::vector<std::string> parts;
    std::size_t start = 0;
    for (std::size_t bar; (bar = text.find(" | ", start)) != std::string::npos; start = bar + 3)
        parts.push_back(text.substr(start, bar - start));
    parts.push_back(text.substr(start));
    return parts;
}

} // namespace

StudyTableColumn metric_column(const std::string& metric, const std::string& feature,
                               const std::string& unit, bool several,
                               const std::string& definition) {
    StudyTableColumn column;
    column.role = Role::metric;
    column.name = with_unit(name_part(metric) + of_feature(feature, several), unit);
    column.label = metric;
    column.feature = feature;
    column.unit = unit;
    column.definition = definition;
    return column;
}

StudyTableColumn error_column(const StudyTableColumn& metric, bool several) {
    return beside(metric, several, Role::error, "_error");
}

StudyTableColumn grid_bound_column(const StudyTableColumn& metric, bool several) {
    return beside(metric, several, Role::grid_bound, "_grid_error");
}

StudyTableColumn target_column(const std::string& metric, const std::string& feature,
                               bool several) {
    StudyTableColumn column;
    column.role = Role::target;
    column.name = "target_" + name_part(metric) + of_feature(feature, several);
    column.label = metric;
    column.feature = feature;
    return column;
}

std::vector<StudyTableColumn> all_columns(const Study& study,
                                          const std::vector<StudyTableColumn>& metrics,
                                          const std::vector<StudyTableColumn>& targets) {
    std::vector<StudyTableColumn> columns{plain_column(Role::point, "point"),
                                          plain_column(Role::status, "status")};
    for (const StudyColumn& input : study.columns) {
        StudyTableColumn column =
            plain_column(Role::input, with_unit(name_part(input.label), input.unit), input.unit);
        column.label = input.label;
        column.path = input.path;
        column.is_linked = input.is_linked;
        column.is_logarithmic = input.is_logarithmic;
        columns.push_back(column);
    }
    columns.insert(columns.end(), metrics.begin(), metrics.end());
    columns.push_back(plain_column(Role::grid_error, "grid_error"));
    columns.insert(columns.end(), targets.begin(), targets.end());
    for (const char* standing : {"measured", "published", "from_memory", "illustrative"})
        columns.push_back(plain_column(Role::standing, std::string("parameters_") + standing, "1"));
    columns.push_back(plain_column(Role::warnings, "warnings", "1"));
    columns.push_back(plain_column(Role::failure, "failure"));
    columns.push_back(plain_column(Role::seconds, "seconds", "s"));
    return columns;
}

std::string header_text(const Study& study, const std::vector<StudyTableColumn>& columns,
                        const std::vector<std::string>& warnings) {
    std::string text = "# title: " + one_line(study.title) + "\n";
    for (const std::string& constant : study.constants)
        text += "# constant: " + one_line(constant) + "\n";
    for (const auto* list : {&study.warnings, &warnings})
        for (const std::string& warning : *list)
            text += "# warning: " + one_line(warning) + "\n";
    text += "# errors: 95 % sampling errors (half widths); the column grid_error says where the "
            "error of the grid was assessed, as a bound; the uncertainty of the parameters is not "
            "assessed\n";
    text += std::string("# caution: ") + caution + "\n";
    std::string names;
    for (const StudyTableColumn& column : columns) {
        text += column_line(column);
        names += (names.empty() ? "" : ",") + column.name;
    }
    return text + names + "\n";
}

void read_header_line(const std::string& line, StudyTable& table) {
    const auto after = [&](const std::string& key) {
        const std::string start = "# " + key + ": ";
        return line.rfind(start, 0) == 0 ? std::optional(line.substr(start.size())) : std::nullopt;
    };
    if (const auto title = after("title")) table.title = *title;
    if (const auto constant = after("constant")) table.constants.push_back(*constant);
    if (const auto warning = after("warning")) table.warnings.push_back(*warning);
    const auto described = after("column");
    if (!described) return;
    std::vector<std::string> parts = parts_of(*described);
    parts.resize(8);
    StudyTableColumn column;
    column.name = parts[0];
    for (const auto& [role, word] : role_words)
        if (parts[1] == word) column.role = role;
    column.label = parts[2];
    column.feature = parts[3];
    column.unit = parts[4];
    column.path = parts[5];
    column.is_linked = parts[6].find("linked") != std::string::npos;
    column.is_logarithmic = parts[6].find("logarithmic") != std::string::npos;
    column.definition = parts[7];
    table.columns.push_back(column);
}

} // namespace rille::engine
