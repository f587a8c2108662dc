// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_view.hpp"

#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fmt/format.h>
#include <map>
#include <numeric>
#include <set>

namespace rille::engine {
namespace {

using nlohmann::json;
using Role = StudyTableColumn::Role;
namespace fs = std::filesystem;

json read_manifest(const std::string& folder) {
    const std::string path = (fs::path(folder) / study_names::manifest).string();
    std::error_code ignored;
    if (!fs::exists(path, ignored)) return nullptr;
    json manifest = json::parse(read_file(path), nullptr, false);
    if (!manifest.is_object())
        throw OutputError(path, "cannot read what the study is", "the file is damaged");
    return manifest;
}

/// Distinct numbers as short as they stay apart.
std::vector<std::string> number_labels(const std::vector<double>& numbers) {
    std::vector<std::string> labels;
    for (int digits = 4; digits <= 17; ++digits) {
        labels.clear();
        for (const double number : numbers)
            labels.push_back(fmt::format("{:.{}g}", number, digits));
        if (std::set<std::string>(labels.begin(), labels.end()).size() == labels.size()) break;
    }
    return labels;
}

void find_levels(const StudyTable& table, StudyAxis& axis) {
    std::map<std::string, std::size_t, std::less<>> seen;
    std::vector<std::string> texts;
    for (std::size_t row = 0; row < table.rows(); ++row) {
        const std::string_view text = table.text(row, axis.column);
        auto found = seen.find(text);
        if (found == seen.end()) {
            found = seen.emplace(std::string(text), texts.size()).first;
            texts.emplace_back(text);
            const auto number = table.number(row, axis.column);
            axis.has_numbers = axis.has_numbers && number.has_value();
            axis.numbers.push_back(number.value_or(0));
        }
        axis.level.push_back(found->second);
    }
    axis.labels = texts;
    if (!axis.has_numbers) return;
    std::vector<std::size_t> order(texts.size()), place(texts.size());
    std::iota(order.begin(), order.end(), 0);
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return axis.numbers[a] < axis.numbers[b];
    });
    std::vector<double> sorted;
    for (std::size_t i = 0; i < order.size(); ++i) {
        place[order[i]] = i;
        sorted.push_back(axis.numbers[order[i]]);
    }
    for (std::size_t& level : axis.level)
        level = place[level];
    axis.numbers = sorted;
    axis.labels = number_labels(sorted);
}

std::vector<StudyAxis> find_axes(const StudyTable& table) {
    std::vector<StudyAxis> axes;
    for (const std::size_t column : table.all(Role::input)) {
        const StudyTableColumn& c = table.columns[column];
        StudyAxis axis;
        axis.column = column;
        axis.title = c.label;
        std::replace(axis.title.begin(), axis.title.end(), '.', ' ');
        axis.title = metric_title(axis.title);
        axis.unit = c.unit == "1" ? "" : c.unit;
        axis.is_linked = c.is_linked;
        axis.is_logarithmic = c.is_logarithmic;
        axis.is_seed = c.path == "sampling.seed";
        axis.has_numbers = true;
        find_levels(table, axis);
        axes.push_back(std::move(axis));
    }
    return axes;
}

/// A column of the study (as study.json counts them) among the axes.
std::optional<std::size_t> axis_of(const json& index, const StudyView& view) {
    if (!index.is_number_unsigned() || index.get<std::size_t>() >= view.axes.size())
        return std::nullopt;
    return index.get<std::size_t>();
}

void find_answer(StudyView& view) {
    const json answer = view.manifest.is_object() ? view.manifest.value("answer", json()) : json();
    if (answer.is_object()) {
        view.y = view.table.metric(answer.value("y", ""), answer.value("feature", ""));
        view.x = axis_of(answer.value("x", json()), view);
        view.line = axis_of(answer.value("line_per", json()), view);
    }
    if (view.y) view.y_error = view.table.error_of(*view.y);
}

void count_points(StudyView& view) {
    for (std::size_t row = 0; row < view.table.rows(); ++row) {
        const std::string status = view.status(row);
        ++(status == study_names::done          ? view.counts.done
           : status == study_names::not_cleared ? view.counts.not_cleared
           : status == study_names::clogged     ? view.counts.clogged
           : status == study_names::killed      ? view.counts.killed
                                                : view.counts.failed);
    }
    view.counts.points = std::max(view.planned, view.table.rows());
}

/// "parameters: 3 measured, 14 published", the largest counts over all points.
std::string standing_text(const StudyView& view) {
    std::string text;
    for (const std::size_t column : view.table.all(Role::standing)) {
        double most = 0;
        for (std::size_t row = 0; row < view.table.rows(); ++row)
            most = std::max(most, view.table.number(row, column).value_or(0));
        std::string name = view.table.columns[column].name;
        if (name.rfind("parameters_", 0) == 0) name = name.substr(11);
        std::replace(name.begin(), name.end(), '_', ' ');
        text += fmt::format("{}{:.0f} {}", text.empty() ? "parameters: " : ", ", most, name);
    }
    return text;
}

} // namespace

std::string StudyAxis::value_text(std::size_t level_index) const {
    return labels.at(level_index) + (unit.empty() ? "" : " " + unit);
}

ChartAxis StudyAxis::chart_axis() const {
    ChartAxis out;
    out.title = title;
    out.unit = unit;
    out.logarithmic = is_logarithmic && has_numbers;
    if (!has_numbers) out.words = labels;
    return out;
}

std::string StudyView::status(std::size_t row) const {
    const auto column = table.find(Role::status);
    return column ? std::string(table.text(row, *column)) : "";
}

std::string StudyView::point(std::size_t row) const {
    const auto column = table.find(Role::point);
    return column ? std::string(table.text(row, *column)) : "";
}

bool StudyView::is_open(std::size_t row) const {
    const std::string word = status(row);
    return word == study_names::not_cleared || word == study_names::clogged;
}

bool StudyView::has_result(std::size_t row) const {
    return status(row) == study_names::done || is_open(row);
}

std::string StudyView::metric_name(std::size_t metric_column) const {
    const StudyTableColumn& column = table.columns[metric_column];
    const bool several =
        std::any_of(table.columns.begin(), table.columns.end(), [&](const StudyTableColumn& other) {
            return other.role == Role::metric && other.feature != column.feature;
        });
    return metric_title(column.label) + (several ? " of " + column.feature : "");
}

std::string StudyView::y_title() const {
    return y ? metric_name(*y) : "";
}

std::string StudyView::y_unit() const {
    return y ? table.columns[*y].unit : "";
}

double StudyView::error(std::size_t row, std::size_t metric_column) const {
    const auto column = table.error_of(metric_column);
    return column ? table.number(row, *column).value_or(0) : 0;
}

std::string StudyView::value_text(std::size_t row, std::size_t metric_column) const {
    const auto value = table.number(row, metric_column);
    return value ? with_error(*value, error(row, metric_column)) : "";
}

std::string StudyView::words(std::size_t row) const {
    std::string text = point(row), inputs;
    for (const StudyAxis& axis : axes)
        if (!axis.is_linked)
            inputs +=
                (inputs.empty() ? "" : ", ") + axis.title + " " + axis.value_text(axis.level[row]);
    if (!inputs.empty()) text += " · " + inputs;
    const std::string value = y ? value_text(row, *y) : "";
    if (!value.empty()) text += ": " + value + unit_suffix(y_unit());
    if (status(row) != study_names::done) text += ", " + status(row);
    return text;
}

FigureText StudyView::figure_text(const std::string& id, const std::string& figure_title) const {
    FigureText text;
    text.id = id;
    text.title = figure_title;
    text.subtitle = title;
    text.constants = table.constants;
    text.caution = caution;
    return text;
}

StudyView read_study_view(const std::string& folder) {
    StudyView view;
    view.manifest = read_manifest(folder);
    std::error_code ignored;
    const bool has_results = fs::exists(fs::path(folder) / study_names::results, ignored);
    if (has_results || !view.manifest.is_object()) view.table = read_study_table(folder);
    view.table.folder = folder;
    if (view.manifest.is_object()) {
        view.planned = view.manifest.value("points", std::size_t(0));
        view.plan = view.manifest.value("plan", "");
        view.title = view.manifest.value("title", "");
        if (!has_results) {
            view.table.constants = view.manifest.value("constants", std::vector<std::string>());
            view.table.warnings = view.manifest.value("warnings", std::vector<std::string>());
        }
    }
    if (view.title.empty()) view.title = view.table.title.empty() ? "Study" : view.table.title;
    view.axes = find_axes(view.table);
    find_answer(view);
    count_points(view);
    const std::string standing = standing_text(view);
    view.caution = "model prediction, not a released recipe" +
                   (standing.empty() ? "" : " · " + standing) +
                   " · errors shown are numerical only";
    return view;
}

StudySlice whole_study(const StudyView& view) {
    StudySlice slice;
    slice.rows.resize(view.table.rows());
    std::iota(slice.rows.begin(), slice.rows.end(), 0);
    return slice;
}

std::vector<StudySlice> study_slices(const StudyView& view, const std::vector<std::size_t>& shown,
                                     std::size_t most) {
    std::vector<const StudyAxis*> others;
    double combinations = 1;
    for (std::size_t a = 0; a < view.axes.size(); ++a) {
        const StudyAxis& axis = view.axes[a];
        if (!axis.is_free() || std::find(shown.begin(), shown.end(), a) != shown.end()) continue;
        others.push_back(&axis);
        combinations *= static_cast<double>(axis.labels.size());
    }
    double cells = combinations;
    for (const std::size_t a : shown)
        cells *= static_cast<double>(std::max<std::size_t>(view.axes[a].labels.size(), 1));
    if (combinations > static_cast<double>(most)) return {};
    // Fewer than a third of the cells of a grid are there: its points do not line up.
    const std::size_t points = std::max(view.planned, view.table.rows());
    if (points > 1 && static_cast<double>(points) < cells / 3) return {};
    std::map<std::vector<std::size_t>, StudySlice> found;
    for (std::size_t row = 0; row < view.table.rows(); ++row) {
        std::vector<std::size_t> key;
        for (const StudyAxis* axis : others)
            key.push_back(axis->level[row]);
        found[key].rows.push_back(row);
    }
    std::vector<StudySlice> slices;
    for (auto& [key, slice] : found) {
        for (std::size_t i = 0; i < others.size(); ++i)
            slice.name += (slice.name.empty() ? "" : ", ") + others[i]->title + " " +
                          others[i]->value_text(key[i]);
        slices.push_back(std::move(slice));
    }
    return slices;
}

std::string metric_title(const std::string& label) {
    std::string text = label;
    std::replace(text.begin(), text.end(), '_', ' ');
    for (std::size_t at = text.find("cd"); at != std::string::npos; at = text.find("cd", at + 2)) {
        const bool starts = at == 0 || text[at - 1] == ' ';
        const bool ends = at + 2 == text.size() || text[at + 2] == ' ';
        if (starts && ends) text.replace(at, 2, "CD");
    }
    return text;
}

std::string unit_suffix(const std::string& unit) {
    return unit.empty() || unit == "1" ? "" : unit == "deg" ? "°" : " " + unit;
}

} // namespace rille::engine
