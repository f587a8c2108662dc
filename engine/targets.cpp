// SPDX-License-Identifier: Apache-2.0
#include "engine/case.hpp"
#include "engine/metrics.hpp"
#include "engine/number_text.hpp"
#include "engine/parameters.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr std::size_t most_named = 2;

/// "yields.silicon by chlorine.energy.threshold" as a person would say it.
std::string spoken(std::string name) {
    for (const char* prefix : {"yields.", "materials."})
        if (name.rfind(prefix, 0) == 0) name.erase(0, std::string(prefix).size());
    std::replace(name.begin(), name.end(), '.', ' ');
    return name;
}

/// " (silicon by chlorine energy threshold, ...)": the first by name, yields before all others.
std::string first_names(const Case& c) {
    std::vector<std::string> names;
    for (const bool yields : {true, false})
        for (const OpenParameter& parameter : c.open_parameters)
            if ((parameter.name.rfind("yields.", 0) == 0) == yields)
                names.push_back(spoken(parameter.name));
    if (names.empty()) return "";
    std::string text = " (" + names[0];
    for (std::size_t i = 1; i < std::min(names.size(), most_named); ++i)
        text += ", " + names[i];
    return text + (names.size() > most_named ? ", ...)" : ")");
}

/// The parameters that keep a verdict open, or nothing.
std::string weak_parameters(const Case& c) {
    std::string text;
    const auto add = [&](fluxes::Standing standing, const char* name) {
        const auto found = c.standing.find(standing);
        if (found == c.standing.end() || found->second == 0) return;
        text += fmt::format("{}{} {}", text.empty() ? "" : " and ", found->second, name);
    };
    add(fluxes::Standing::illustrative, "illustrative");
    add(fluxes::Standing::from_memory, "from memory");
    return text.empty()
               ? ""
               : fmt::format("of the parameters of {}, {}{}", c.chemistry, text, first_names(c));
}

std::string range_text(const Target& target, const std::string& unit) {
    const std::string suffix = unit == "1" ? "" : " " + unit;
    if (target.at_least && target.at_most)
        return rounded(*target.at_least) + " to " + rounded(*target.at_most) + suffix;
    if (target.at_least) return "at least " + rounded(*target.at_least) + suffix;
    return "at most " + (target.at_most ? rounded(*target.at_most) : "?") + suffix;
}

/// "mask left after over: at least 40 nm"
std::string full_text(const Target& target, const std::string& range) {
    return target.metric + (target.after.empty() ? "" : " after " + target.after) + ": " + range;
}

TargetVerdict judge_metric(const Case& c, const Target& target, const Metric& metric, bool is_due) {
    TargetVerdict result;
    result.target =
        full_text(target, target.text.empty() ? range_text(target, metric.unit) : target.text);
    result.metric = metric.name;
    result.feature = metric.feature;
    result.after = target.after;
    result.value = metric.value;
    result.sampling_error = metric.sampling_error;
    result.unit = metric.unit;
    if (metric.value) {
        result.by_numbers = judge(*metric.value, metric.error(), target);
        result.reason = with_error(*metric.value, metric.error()) +
                        (metric.unit == "1" ? "" : " " + metric.unit);
        if (result.by_numbers == Verdict::undecided) result.reason += " straddles the limit";
    } else {
        result.by_numbers = Verdict::missed;
        result.reason = "no such value: " + metric.note;
    }
    result.verdict = result.by_numbers;
    if (!is_due) {
        result.verdict = Verdict::undecided;
        result.reason = "the run has not come to its end; where it stands: " + result.reason;
        return result;
    }
    const std::string weak = weak_parameters(c);
    if (!weak.empty() && result.by_numbers != Verdict::undecided) {
        result.verdict = Verdict::undecided;
        result.reason +=
            fmt::format("; {} by the numbers, but {}", verdict_name(result.by_numbers), weak);
    }
    return result;
}

/// What a target is judged by; null where the run has not come to the end of its step.
const std::vector<Metric>* values_of(const Metrics& metrics, const Target& target) {
    if (target.after.empty()) return &metrics.metrics;
    for (const StepMetrics& step : metrics.after)
        if (step.step == target.after) return &step.metrics;
    return nullptr;
}

json metric_json(const Metric& m) {
    json entry = {{"name", m.name},
                  {"feature", m.feature},
                  {"value", nullptr},
                  {"unit", m.unit},
                  {"sampling_error", m.sampling_error},
                  {"grid_error", "not assessed"},
                  {"definition", m.definition}};
    if (m.grid_error) entry["grid_error"] = *m.grid_error;
    if (m.value)
        entry["value"] = *m.value;
    else
        entry["note"] = m.note;
    return entry;
}

json verdict_json(const TargetVerdict& v) {
    json entry = {{"target", v.target},
                  {"metric", v.metric},
                  {"feature", v.feature},
                  {"after", v.after},
                  {"value", nullptr},
                  {"unit", v.unit},
                  {"sampling_error", v.sampling_error},
                  {"verdict", verdict_name(v.verdict)},
                  {"by_numbers", verdict_name(v.by_numbers)},
                  {"reason", v.reason}};
    if (v.value) entry["value"] = *v.value;
    return entry;
}

/// Everything that was measured at the ends of steps.
json after_json(const std::vector<StepMetrics>& steps) {
    json list = json::array();
    for (const StepMetrics& step : steps) {
        json values = json::array();
        for (const Metric& m : step.metrics)
            values.push_back(metric_json(m));
        list.push_back({{"step", step.step}, {"time_s", step.time_s}, {"metrics", values}});
    }
    return list;
}

json open_parameters_json(const Case& c) {
    json list = json::array();
    for (const OpenParameter& parameter : c.open_parameters)
        list.push_back({{"name", parameter.name}, {"standing", standing_word(parameter.standing)}});
    return list;
}

/// Pads by characters seen, not bytes: the table holds a two-byte plus-minus sign.
std::string padded(const std::string& text, std::size_t width) {
    std::size_t seen = 0;
    for (const char ch : text)
        seen += (static_cast<unsigned char>(ch) & 0xC0) != 0x80;
    return text + std::string(seen < width ? width - seen : 0, ' ');
}

std::string with_unit(const std::string& value, const std::string& unit) {
    return unit == "1" ? value : value + " " + unit;
}

} // namespace

double Metric::error() const {
    return std::hypot(sampling_error, grid_error.value_or(0));
}

bool Metrics::has_grid_errors() const {
    return std::any_of(metrics.begin(), metrics.end(),
                       [](const Metric& m) { return m.grid_error.has_value(); });
}

std::string errors_text(const Metrics& metrics) {
    return metrics.has_grid_errors()
               ? "± 95 % sampling error, then the bound on the error of the grid; parameter "
                 "uncertainty: not assessed"
               : "± 95 % sampling error; grid error and parameter uncertainty: not assessed";
}

std::string value_text(const Metric& m) {
    if (!m.grid_error) return with_error(*m.value, m.sampling_error);
    const double error = m.error();
    const auto part = [&](double of) {
        return of > 0 && of < 0.005 ? std::string("<0.01") : rounded(of, error);
    };
    return rounded(*m.value, error) + " ± " + part(m.sampling_error) + " ± " + part(*m.grid_error);
}

const Metric* Metrics::find(const std::string& name, const std::string& feature) const {
    const auto found = std::find_if(metrics.begin(), metrics.end(), [&](const Metric& m) {
        return m.name == name && (feature.empty() || m.feature == feature);
    });
    return found == metrics.end() ? nullptr : &*found;
}

const char* verdict_name(Verdict verdict) {
    switch (verdict) {
    case Verdict::met:
        return "met";
    case Verdict::missed:
        return "missed";
    default:
        return "undecided";
    }
}

Verdict judge(double value, double error, const Target& target) {
    if (!std::isfinite(value) || !std::isfinite(error)) return Verdict::undecided;
    const double low = value - error, high = value + error;
    if ((target.at_least && high < *target.at_least) || (target.at_most && low > *target.at_most))
        return Verdict::missed;
    if ((target.at_least && low < *target.at_least) || (target.at_most && high > *target.at_most))
        return Verdict::undecided;
    return Verdict::met;
}

std::vector<TargetVerdict> judge_targets(const Case& c, const Metrics& metrics) {
    std::vector<TargetVerdict> verdicts;
    for (const Target& target : c.targets) {
        std::string name = target.metric, feature;
        if (const auto of = name.rfind(" of "); of != std::string::npos) {
            feature = name.substr(of + 4);
            name.resize(of);
        }
        const std::vector<Metric>* values = values_of(metrics, target);
        bool found = false;
        if (values)
            for (const Metric& metric : *values)
                if (metric.name == name && (feature.empty() || metric.feature == feature)) {
                    verdicts.push_back(
                        judge_metric(c, target, metric, metrics.is_final || !target.after.empty()));
                    found = true;
                }
        if (!found) {
            TargetVerdict none;
            none.target = full_text(target, target.text);
            none.metric = name;
            none.feature = feature;
            none.after = target.after;
            none.reason = values ? "this case has no metric of that name"
                                 : "nothing is known of the end of step " + target.after;
            verdicts.push_back(none);
        }
    }
    return verdicts;
}

json metrics_json(const Case& c, const Metrics& metrics) {
    json list = json::array(), targets = json::array(), clearing = json::array();
    for (const Metric& m : metrics.metrics)
        list.push_back(metric_json(m));
    for (const TargetVerdict& v : metrics.targets)
        targets.push_back(verdict_json(v));
    for (const Metrics::Clearing& entry : metrics.clearing)
        clearing.push_back({{"feature", entry.feature},
                            {"film", entry.film},
                            {"cleared", entry.cleared},
                            {"remaining_nm", entry.remaining_nm}});
    json all = {{"title", c.title},
                {"time_s", metrics.time_s},
                {"final", metrics.is_final},
                {"errors", metrics.has_grid_errors()
                               ? "sampling_error: 95 %, from 8 batches; grid_error: a bound, from "
                                 "the same case on coarser grids; the uncertainty of the "
                                 "parameters is not assessed"
                               : "sampling_error: 95 %, from 8 batches; grid error and the "
                                 "uncertainty of the parameters are not assessed"},
                {"metrics", list},
                {"clearing", clearing},
                {"targets", targets},
                {"open_parameters", open_parameters_json(c)}};
    if (!metrics.after.empty()) all["after_steps"] = after_json(metrics.after);
    if (!metrics.comparison.contours.empty() || !metrics.comparison.cds.empty())
        all["comparison"] = comparison_json(metrics.comparison);
    return all;
}

std::string metrics_table(const Case& c, const Metrics& metrics) {
    std::size_t width = 0;
    const bool several = c.mask.openings.size() > 1;
    const auto label = [&](const Metric& m) {
        return several ? m.feature + ": " + m.name : m.name;
    };
    for (const Metric& m : metrics.metrics)
        width = std::max(width, label(m).size());
    std::string text;
    for (const Metric& m : metrics.metrics) {
        const std::string value =
            m.value ? with_unit(value_text(m), m.unit) : "-  (" + m.note + ")";
        text += "  " + padded(label(m), width + 2) + value + "\n";
    }
    for (const Metrics::Clearing& entry : metrics.clearing)
        text += "  " + padded(several ? entry.feature + ": " + entry.film : entry.film, width + 2) +
                (entry.cleared ? "cleared" : rounded(entry.remaining_nm) + " nm left") + "\n";
    for (const TargetVerdict& v : metrics.targets)
        text += "  " + padded(verdict_name(v.verdict), 10) + v.target + "  (" + v.reason + ")\n";
    return text + "  " + errors_text(metrics) + "\n";
}

} // namespace rille::engine
