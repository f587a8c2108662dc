// SPDX-License-Identifier: Apache-2.0
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/report/study_parts.hpp"
#include "engine/study/study_names.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using nlohmann::json;

json read_effects(const std::string& folder) {
    const auto path = std::filesystem::path(folder) / study_names::effects_json;
    std::error_code ignored;
    if (!std::filesystem::exists(path, ignored)) return nullptr;
    json effects = json::parse(read_file(path.string()), nullptr, false);
    return effects.is_object() ? effects : json();
}

std::string text_at(const json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_string() ? found->get<std::string>() : "";
}

double number_at(const json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_number() ? found->get<double>() : std::nan("");
}

std::string axis_name(const json& axis) {
    std::string name = text_at(axis, "axis");
    std::replace(name.begin(), name.end(), '.', ' ');
    return metric_title(name);
}

std::string percent(double share) {
    return fmt::format("{:.0f} %", 100 * share);
}

/// Bars of the shares of the variance, for the metrics that have any.
BarChart share_chart(const StudyView& view, const json& metric, const std::string& id) {
    BarChart chart;
    const std::string name = metric_title(text_at(metric, "metric"));
    chart.text = view.figure_text(id, "What moves the " + name + " most");
    chart.axis_title = "share of its variance (%)";
    for (const json& axis : metric.value("axes", json::array())) {
        const double share = number_at(axis, "first_order");
        if (!std::isfinite(share)) continue;
        Bar bar;
        bar.name = axis_name(axis);
        bar.value = 100 * share;
        bar.low = 100 * number_at(axis, "low");
        bar.high = 100 * number_at(axis, "high");
        bar.text = percent(share);
        chart.bars.push_back(bar);
    }
    std::stable_sort(chart.bars.begin(), chart.bars.end(),
                     [](const Bar& a, const Bar& b) { return a.value > b.value; });
    chart.text.notes = {
        "First-order sensitivity: the share of the variance over the points that an "
        "axis explains on its own; bars: 95 % interval."};
    const double together = number_at(metric, "together");
    if (std::isfinite(together))
        chart.text.notes.push_back(percent(together) +
                                   " is left to axes acting together and to noise.");
    return chart;
}

/// Every metric with the span and the share of each axis.
std::string spans_html(const json& metrics) {
    DataTable table;
    table.id = "spans";
    table.caption = "Main effects";
    table.columns = {{"quantity", false, "", true}, {"axis"},
                     {"span of the means", true},   {"share of the variance", true},
                     {"95 % interval", true},       {"remark"}};
    for (const json& metric : metrics)
        for (const json& axis : metric.value("axes", json::array())) {
            const double span = number_at(axis, "span"), share = number_at(axis, "first_order");
            const bool known = std::isfinite(share);
            table.rows.push_back({{metric_title(text_at(metric, "metric"))},
                                  {axis_name(axis)},
                                  {std::isfinite(span) ? fmt::format("{:.3g}", span) +
                                                             unit_suffix(text_at(metric, "unit"))
                                                       : "",
                                   std::isfinite(span) ? shortest(span) : ""},
                                  {known ? percent(share) : "", known ? shortest(share) : ""},
                                  {known ? percent(number_at(axis, "low")) + " to " +
                                               percent(number_at(axis, "high"))
                                         : ""},
                                  {text_at(axis, "note")}});
        }
    return table_html(table);
}

/// "1.2 ± 0.1 + (0.0042 ± 0.0003) x"
std::string formula(const json& fit) {
    static const char* const powers[] = {"", " x", " x²"};
    const json coefficients = fit.value("coefficients", json::array()),
               errors = fit.value("errors", json::array());
    std::string text;
    for (std::size_t i = 0; i < coefficients.size() && i < 3; ++i) {
        text += i ? " + " : "";
        text += fmt::format("({:.4g}", coefficients[i].get<double>());
        if (i < errors.size()) text += fmt::format(" ± {:.2g}", errors[i].get<double>());
        text += std::string(")") + powers[i];
    }
    return text;
}

std::string fits_html(const json& effects) {
    const json fits = effects.value("fits", json::array());
    const std::string none = text_at(effects, "no_fits");
    if (fits.empty()) return none.empty() ? "" : "<p>No fit: " + escaped(none) + ".</p>\n";
    DataTable table;
    table.id = "fits";
    table.caption = "Fits to the curve, only between the points that they come from";
    table.columns = {
        {"line", false, "", true}, {"model"}, {"y ="}, {"from", true}, {"to", true}, {"why"}};
    for (const json& fit : fits)
        table.rows.push_back({{text_at(fit, "line").empty() ? "all" : text_at(fit, "line")},
                              {text_at(fit, "model")},
                              {formula(fit)},
                              {fmt::format("{:.4g}", number_at(fit, "x_low"))},
                              {fmt::format("{:.4g}", number_at(fit, "x_high"))},
                              {text_at(fit, "reason")}});
    return table_html(table);
}

} // namespace

PageSection effects_section(const StudyParts& p) {
    PageSection section{"effects", "What matters most", "", false};
    const json effects = read_effects(p.view.table.folder);
    if (!effects.is_object()) return section;
    try {
        const json metrics = effects.value("metrics", json::array());
        if (metrics.empty()) return section;
        const BarChart chart = share_chart(p.view, metrics.front(), "sensitivity");
        if (!chart.bars.empty())
            section.html =
                "<div>" +
                figure_html(p.show("", chart, text_at(metrics.front(), "method")).figure) +
                "</div>\n";
        section.html += spans_html(metrics) + fits_html(effects);
    } catch (const json::exception&) {
        section.html = "<p class=\"warning\">effects.json cannot be read.</p>\n";
    }
    return section;
}

} // namespace rille::engine
