// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_effects.hpp"

#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/study/study_names.hpp"

#include <cmath>
#include <nlohmann/json.hpp>

namespace rille::engine {

namespace {

using nlohmann::json;

const char* const meaning =
    "first_order: share of the variance of the metric that the axis explains on its own, with a 95 "
    "% interval; span: largest less smallest mean over the values of the axis; fits hold between "
    "x_low and x_high only. Errors are sampling errors; grid error and the uncertainty of the "
    "parameters are not assessed";

json number(double value) {
    return std::isfinite(value) ? json(value) : json(nullptr);
}

json axis_json(const AxisEffect& axis) {
    json levels = json::array();
    for (const EffectLevel& level : axis.levels) {
        json one = {
            {"mean", number(level.mean)}, {"error", number(level.error)}, {"points", level.count}};
        if (!level.word.empty())
            one["value"] = level.word;
        else if (level.from == level.to)
            one["value"] = level.from;
        else
            one.update({{"from", level.from}, {"to", level.to}});
        levels.push_back(one);
    }
    json result = {{"axis", axis.label},
                   {"unit", axis.unit},
                   {"span", number(axis.span)},
                   {"levels", levels},
                   {"first_order", nullptr}};
    if (axis.first_order)
        result.update({{"first_order", *axis.first_order}, {"low", axis.low}, {"high", axis.high}});
    else
        result["note"] = axis.note;
    return result;
}

json fit_json(const ResponseFit& fit) {
    return {{"line", fit.line},
            {"model", fit.model},
            {"reason", fit.reason},
            {"coefficients", fit.coefficients},
            {"errors", fit.errors},
            {"chi_squared", number(fit.chi_squared)},
            {"degrees_of_freedom", fit.degrees_of_freedom},
            {"probability", number(fit.probability)},
            {"largest_residual", number(fit.largest_residual)},
            {"x_low", fit.x_low},
            {"x_high", fit.x_high}};
}

/// Rows of effects.csv: what is not there stays empty.
class Sheet {
public:
    void add(const std::vector<std::string>& cells) {
        for (std::size_t c = 0; c < cells.size(); ++c)
            text_ += (c ? "," : "") + csv_field(cells[c]);
        text_ += '\n';
    }
    void remark(const std::string& text) { text_ += "# " + text + "\n"; }
    const std::string& text() const { return text_; }

private:
    std::string text_;
};

void add_axis(const Effects& effects, const AxisEffect& axis, Sheet& sheet) {
    const std::vector<std::string> head = {effects.response, effects.unit, axis.label, axis.unit};
    const auto row = [&](const std::string& quantity, const std::string& from,
                         const std::string& to, const std::string& value, const std::string& low,
                         const std::string& high, std::size_t points, const std::string& note) {
        std::vector<std::string> cells = head;
        for (const std::string& cell :
             {quantity, from, to, value, low, high, std::to_string(points), note})
            cells.push_back(cell);
        sheet.add(cells);
    };
    const std::size_t n = effects.points;
    if (axis.first_order)
        row("first_order", "", "", shortest(*axis.first_order), shortest(axis.low),
            shortest(axis.high), n, "");
    else
        row("first_order", "", "", "", "", "", n, axis.note);
    row("span", "", "", shortest(axis.span), "", "", n, "");
    for (const EffectLevel& level : axis.levels)
        row("mean", level.word.empty() ? shortest(level.from) : level.word,
            level.word.empty() ? shortest(level.to) : level.word, shortest(level.mean),
            shortest(level.mean - level.error), shortest(level.mean + level.error), level.count,
            "");
}

void add_fit(const std::string& response, const std::string& unit, const ResponseFit& fit,
             Sheet& sheet) {
    if (fit.model == "none")
        sheet.add({response, unit, fit.line, "", "fit", "", "", "", "", "", "", fit.reason});
    for (std::size_t k = 0; fit.model != "none" && k < fit.coefficients.size(); ++k)
        sheet.add({response, unit, fit.line, "", "fit c" + std::to_string(k), shortest(fit.x_low),
                   shortest(fit.x_high), shortest(fit.coefficients[k]),
                   shortest(fit.coefficients[k] - fit.errors[k]),
                   shortest(fit.coefficients[k] + fit.errors[k]), "",
                   fit.model + "; " + fit.reason});
}

} // namespace

json effects_json(const StudyTable& table, const StudyEffects& effects) {
    json metrics = json::array(), fits = json::array();
    for (const auto& [column, one] : effects.metrics) {
        json axes = json::array();
        for (const AxisEffect& axis : one.axes)
            axes.push_back(axis_json(axis));
        json entry = {{"column", table.columns[column].name},
                      {"metric", one.response},
                      {"unit", one.unit},
                      {"points", one.points},
                      {"left_out", one.left_out},
                      {"mean", number(one.mean)},
                      {"deviation", number(one.deviation)},
                      {"full_grid", one.is_full_grid},
                      {"method", one.method},
                      {"axes", axes},
                      {"together", nullptr}};
        if (one.together) entry["together"] = *one.together;
        metrics.push_back(entry);
    }
    for (const ResponseFit& fit : effects.fits)
        fits.push_back(fit_json(fit));
    json result = {{"format", 1},        {"title", table.title},
                   {"meaning", meaning}, {"constants", table.constants},
                   {"metrics", metrics}, {"fits", fits}};
    if (!effects.no_fits.empty()) result["no_fits"] = effects.no_fits;
    return result;
}

std::string effects_csv(const StudyTable& table, const StudyEffects& effects) {
    Sheet sheet;
    sheet.remark(table.title);
    for (const std::string& constant : table.constants)
        sheet.remark("constant: " + constant);
    sheet.remark(meaning);
    sheet.add({"metric", "unit", "axis", "axis_unit", "quantity", "from", "to", "value", "low",
               "high", "points", "note"});
    for (const auto& [column, one] : effects.metrics)
        for (const AxisEffect& axis : one.axes)
            add_axis(one, axis, sheet);
    if (effects.metrics.empty()) return sheet.text();
    const Effects& answer = effects.metrics.front().second;
    for (const ResponseFit& fit : effects.fits)
        add_fit(answer.response, answer.unit, fit, sheet);
    return sheet.text();
}

void write_study_effects(const std::string& folder, const Study& study) {
    const StudyTable table = read_study_table(folder);
    const StudyEffects effects = study_effects(table, answer_columns(table, study));
    OutputFolder out(folder, OutputFolder::Existing::keep);
    out.write(study_names::effects_json, effects_json(table, effects).dump(2) + "\n");
    out.write(study_names::effects_csv, effects_csv(table, effects));
}

} // namespace rille::engine
