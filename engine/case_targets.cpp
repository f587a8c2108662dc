// SPDX-License-Identifier: Apache-2.0
// The names of what is measured, and the goals that a case states for it.
#include "engine/case_build.hpp"

#include "engine/comparison.hpp"
#include "engine/metrics.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

namespace {

std::vector<MetricName> names_with(const std::vector<std::string>& labels, const Case& c) {
    const Dimension length = Dimension::length, angle = Dimension::angle;
    const bool is_full = !c.domain.extruded(); // holes are measured in y and by area
    std::vector<MetricName> list;
    for (const std::string& label : labels) {
        for (const char* kind : {" cd", " cd_change"})
            list.push_back({label + kind, length});
        if (!is_full) list.push_back({label + " cd_loss", length});
        for (const char* kind : {" cd y", " cd area"})
            if (is_full) list.push_back({label + kind, length});
    }
    for (const char* name : {"bow", "bow cd", "bow depth", "depth centre", "depth edge",
                             "microtrench depth", "undercut", "mask left"})
        list.push_back({name, length});
    for (const char* name : {"sidewall angle left", "sidewall angle right", "facet angle"})
        list.push_back({name, angle});
    list.push_back({"selectivity", std::nullopt});
    if (const auto& contour = c.measured.contour) {
        const bool several = contour->cut_most > contour->cut_least;
        for (const double cut : {contour->cut_least, contour->cut_most})
            list.push_back({contour_metric(cut, several), length});
    }
    for (const MeasuredCd& cd : c.measured.cds)
        list.push_back({cd.place + " cd difference", length});
    for (const geometry::Film& film : c.films)
        if (film.name != "mask") list.push_back({film.name + " loss", length});
    return list;
}

struct TargetReader {
    const Entry& entry;
    const std::string& metric; ///< as written; "NAME of OPENING" where there are several
    const std::vector<MetricName>& known;
    const std::vector<std::string>& openings;
    const std::vector<std::string>& steps;
    Problems& problems;

    static void wrong(const Entry& where, const std::string& message, Problems& problems) {
        problems.add(where.at, where.path, message);
    }
    void wrong(const std::string& message) { wrong(entry, message, problems); }

    /// What the target is about; nullptr and a problem if there is no such quantity.
    const MetricName* quantity() {
        std::string name = metric;
        const std::size_t of = metric.rfind(" of ");
        if (of != std::string::npos) {
            const std::string opening = metric.substr(of + 4);
            name = metric.substr(0, of);
            if (std::find(openings.begin(), openings.end(), opening) == openings.end()) {
                wrong(fmt::format("no opening is called {}; there are: {}{}", quoted(opening),
                                  listed(openings, 8), did_you_mean(opening, openings)));
                return nullptr;
            }
        }
        std::vector<std::string> names;
        for (const MetricName& one : known) {
            if (one.name == name) return &one;
            names.push_back(one.name);
        }
        wrong(fmt::format("no quantity is called {}; there are: {}{}", quoted(name),
                          listed(names, 24), did_you_mean(name, names)));
        return nullptr;
    }

    std::optional<double> value(const Entry& where, const std::string& text,
                                std::optional<Dimension> dimension) {
        std::string error;
        double result = 0;
        if (dimension) {
            const QuantityText read = parse_quantity(text, *dimension);
            error = read.error;
            result = read.value;
        } else {
            const NumberText read = split_number(text);
            error = read.error;
            if (error.empty() && !read.unit.empty())
                error = quoted(text) + ": a number without a unit is due";
            result = read.value;
        }
        if (error.empty()) return result;
        wrong(where, error, problems);
        return std::nullopt;
    }

    Target read() {
        Target target;
        target.metric = metric;
        target.text = entry.text;
        const MetricName* measured = quantity();
        if (entry.rule->kind == Rule::Kind::map)
            read_map(measured, target);
        else if (measured)
            read_sentence(measured->dimension, target);
        if (target.at_least && target.at_most && *target.at_least > *target.at_most)
            wrong(entry.rule->kind == Rule::Kind::map
                      ? "at_least is above at_most"
                      : quoted(entry.text) + ": the first value is the smaller one");
        return target;
    }

    void read_sentence(std::optional<Dimension> due, Target& target) {
        const std::string& text = entry.text;
        const std::size_t to = text.find(" to ");
        if (text.rfind("at least ", 0) == 0) {
            target.at_least = value(entry, text.substr(9), due);
        } else if (text.rfind("at most ", 0) == 0) {
            target.at_most = value(entry, text.substr(8), due);
        } else if (to != std::string::npos) {
            read_range(text.substr(0, to), trimmed(text.substr(to + 4)), due, target);
        } else {
            const bool sign = text.find_first_of("<>=") != std::string::npos;
            wrong(fmt::format("{} is not a goal; write at least X, at most X, or X to Y{}",
                              quoted(text), sign ? " (signs such as >= are not read)" : ""));
        }
    }

    /// "55 to 65 nm": the unit of the upper end holds for the lower one too.
    void read_range(std::string low, const std::string& high, std::optional<Dimension> due,
                    Target& target) {
        const NumberText first = split_number(low), last = split_number(high);
        if (first.error.empty() && first.unit.empty() && last.error.empty()) low += " " + last.unit;
        target.at_most = value(entry, high, due);
        if (target.at_most) target.at_least = value(entry, low, due);
    }

    /// {at_least: X, at_most: X, after: STEP}
    void read_map(const MetricName* measured, Target& target) {
        const Entry &least = entry["at_least"], &most = entry["at_most"], &after = entry["after"];
        if (!least.is_given && !most.is_given)
            wrong("states no goal; give at_least, at_most or both");
        if (measured && least.is_good)
            target.at_least = value(least, least.text, measured->dimension);
        if (measured && most.is_good) target.at_most = value(most, most.text, measured->dimension);
        target.text = least.is_good && most.is_good ? least.text + " to " + most.text
                      : least.is_good               ? "at least " + least.text
                                                    : "at most " + most.text;
        if (!after.is_good) return;
        target.after = after.text;
        if (!steps.empty() && std::find(steps.begin(), steps.end(), after.text) == steps.end())
            wrong(after,
                  fmt::format("no step of the recipe is called {}; there are: {}{}",
                              quoted(after.text), listed(steps, 12),
                              did_you_mean(after.text, steps)),
                  problems);
    }
};

} // namespace

std::vector<MetricName> metric_names(const Case& c) {
    std::vector<std::string> labels;
    for (const auto& [label, place] : c.cd_places)
        labels.push_back(label);
    return names_with(labels, c);
}

void build_targets(const Entry& root, Case& result, Problems& problems) {
    std::vector<std::string> labels; // also of heights that are wrong, which is said already
    for (const auto& [label, entry] : root["measure"]["cd"].members)
        labels.push_back(label);
    const std::vector<MetricName> known = names_with(labels, result);
    const std::vector<std::string> openings = opening_names(result);
    std::vector<std::string> steps;
    for (const Entry& step : root["recipe"]["steps"].items)
        if (step["name"].is_good) steps.push_back(step["name"].text);
    for (const auto& [metric, entry] : root["targets"].members)
        if (entry.is_good)
            result.targets.push_back(
                TargetReader{entry, metric, known, openings, steps, problems}.read());
    for (const auto& [key, entry] : root["tool_log"].members) {
        const YamlNode& raw = entry.raw;
        result.tool_log.push_back(key + ": " + (raw.is_scalar() ? raw.text : what_it_is(raw)));
    }
}

} // namespace rille::engine
