// SPDX-License-Identifier: Apache-2.0
// The first screen of a run's report: what was asked and what came out.
#include "engine/caution.hpp"
#include "engine/console.hpp"
#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/run_record.hpp"
#include "engine/sheath_figures.hpp"
#include "engine/sheath_model.hpp"
#include "engine/svg.hpp"
#include "engine/units.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <set>

namespace rille::engine {
namespace {

using nlohmann::json;

std::string in_nm(double value) {
    return fmt::format("{:.4g} nm", value);
}

std::string opening_text(const geometry::Opening& opening) {
    const std::string name = opening.name.empty() ? "" : opening.name + ": ";
    switch (opening.shape) {
    case geometry::Opening::Shape::trench:
        return name + "trench, " + in_nm(opening.width_x) + " wide";
    case geometry::Opening::Shape::round:
        return name + "round, " + in_nm(opening.width_x) + " across";
    default:
        return name + "elliptic, " + in_nm(opening.width_x) + " by " + in_nm(opening.width_y);
    }
}

std::string openings_text(const Case& c) {
    if (c.mask.openings.empty()) return "no mask";
    std::string text;
    const std::size_t shown = std::min<std::size_t>(c.mask.openings.size(), 4);
    for (std::size_t i = 0; i < shown; ++i)
        text += (i ? "; " : "") + opening_text(c.mask.openings[i]);
    if (shown < c.mask.openings.size())
        text += fmt::format("; and {} more", c.mask.openings.size() - shown);
    const geometry::Domain& d = c.domain;
    if (d.revolved()) return text + ", in a round cell " + in_nm(2 * d.width_x()) + " across";
    text += d.extruded() ? ", in a period of " + in_nm(d.width_x())
                         : ", in a period of " + in_nm(d.width_x()) + " by " + in_nm(d.width_y());
    return text + (d.sides == geometry::Sides::mirror ? ", mirrored" : ", repeated");
}

std::string stack_text(const Case& c) {
    std::string text;
    for (const geometry::Film& film : c.films) {
        const std::string& material = c.materials.at(film.material);
        text += text.empty() ? "" : " / ";
        text += film.name == material ? film.name : film.name + " (" + material + ")";
        if (std::isfinite(film.bottom)) text += " " + in_nm(film.top - film.bottom);
    }
    return text;
}

std::string plasma_text(const Plasma& plasma) {
    std::string text = fmt::format("{}: ion flux {:.3g} mA/cm²", plasma.name,
                                   plasma.ion_flux / units_of(Dimension::ion_flux).front().factor);
    if (!plasma.arrivals || plasma.arrivals->ions.empty()) return text;
    double mean = 0, flux = 0;
    for (const IonAtWafer& ion : plasma.arrivals->ions) {
        mean += ion.flux * figures_of(ion.ions.front()).mean_ev;
        flux += ion.flux;
    }
    if (flux > 0) text += fmt::format(", ions of {:.3g} eV on average", mean / flux);
    if (plasma.pressure_pa)
        text += fmt::format(", {:.3g} mTorr",
                            *plasma.pressure_pa / units_of(Dimension::pressure).front().factor);
    return text;
}

std::string step_text(const RecipeStep& step) {
    std::string text;
    switch (step.end.kind) {
    case StepEnd::Kind::time:
        return time_text(step.end.time_s);
    case StepEnd::Kind::share_of_step:
        return rounded(100 * step.end.share, 20) + " % of " + step.end.of_step;
    case StepEnd::Kind::reaches:
        text = "until it reaches " + step.end.film + " at ";
        break;
    default:
        text = "until " + step.end.film + " is cleared at ";
    }
    text += step.end.at == "open field" ? "the open field" : "the centre of " + step.end.at;
    if (step.no_longer_than_s > 0) text += ", at most " + time_text(step.no_longer_than_s);
    return text;
}

/// How a recipe step ended, as the record has it.
std::string step_outcome(const RunParts& p, std::size_t index) {
    const json& record = p.folder.record;
    if (!record.is_object()) return "not known";
    const json steps = record.value("steps", json::array());
    for (const json& step : steps)
        if (step.value("name", "") == p.c.steps[index].name) {
            const std::string reason = step.value("ended_by", "");
            return time_text(step.value("duration_s", 0.0)) +
                   (reason == "time" ? "" : ": " + reason);
        }
    if (index > steps.size()) return "not begun";
    const double begun = steps.empty() ? 0.0 : steps.back().value("end_s", 0.0);
    return "stopped " + time_text(record.value("simulated_s", 0.0) - begun) + " into it";
}

/// Metrics of the first screen, in this order; CDs of every name come first.
bool is_key(const std::string& name) {
    static const std::set<std::string> keys = {"depth centre",        "bow",
                                               "sidewall angle left", "sidewall angle right",
                                               "mask left",           "undercut"};
    const bool cd = name.size() > 3 && name.compare(name.size() - 3, 3, " cd") == 0;
    return keys.count(name) || (cd && name != "bow cd");
}

std::string shown_value(const Metric& m) {
    return m.value ? value_text(m) + unit_text(m.unit) : "none";
}

DataTable::Cell value_cell(const Metric* m) {
    if (!m) return {"", "", ""};
    DataTable::Cell cell{shown_value(*m)};
    if (m->value) cell.copied = shortest(*m->value);
    return cell;
}

/// A bar of the counts; what it shows stands in words below it.
std::string standing_bar(const std::vector<std::pair<std::string, int>>& counts) {
    static constexpr const char* fills[] = {"#1f7a6d", "#7a9cc6", "#f0c75a", "#e8a9a0"};
    std::string html = "<div class=\"bar\" aria-hidden=\"true\">";
    for (std::size_t i = 0; i < counts.size(); ++i)
        if (counts[i].second > 0)
            html += fmt::format("<span style=\"flex-grow: {}; background: {}\"></span>",
                                counts[i].second, fills[i]);
    return html + "</div>\n";
}

} // namespace

std::vector<std::string> places_from_the_top(const Case& c) {
    std::vector<std::string> names;
    for (const auto& place : c.cd_places)
        names.push_back(place.first);
    std::stable_sort(names.begin(), names.end(), [&](const std::string& a, const std::string& b) {
        return c.cd_places.at(a).z > c.cd_places.at(b).z;
    });
    return names;
}

std::string metric_label(const std::string& name) {
    std::string label = name;
    for (std::size_t at = label.find("cd"); at != std::string::npos;
         at = label.find("cd", at + 2)) {
        const bool starts = at == 0 || label[at - 1] == ' ';
        const bool ends = at + 2 == label.size() || label[at + 2] == ' ' || label[at + 2] == '_';
        if (starts && ends) label.replace(at, 2, "CD");
    }
    std::replace(label.begin(), label.end(), '_', ' ');
    return label;
}

std::string unit_text(const std::string& unit) {
    return unit == "1" ? "" : unit == "deg" ? "°" : " " + unit;
}

std::string outcome_html(const RunParts& p) {
    const json& record = p.folder.record;
    const std::string resume = p.folder.can_be_resumed
                                   ? "<br>To take it up from there: <code>rille resume " +
                                         escaped(p.folder.path) + "</code>"
                                   : "";
    if (!record.is_object())
        return "<p class=\"outcome stopped\"><strong>Not finished.</strong> " +
               std::string(p.folder.can_be_resumed
                               ? "The run left no record: it is still going on, or was killed. "
                                 "Shown is the last moment that it wrote; it may have come "
                                 "further."
                               : "The run left no record: it was stopped before its end, or this "
                                 "folder keeps part of it. Shown is what is here.") +
               resume + "</p>";
    const std::string status = record.value("status", "");
    const std::string took =
        " " + duration_text(record.value("/machine/wall_seconds"_json_pointer, 0.0)) +
        " of computing for " + time_text(record.value("simulated_s", 0.0)) + " of etching.";
    if (status == "done")
        return "<p class=\"outcome done\"><strong>Done.</strong> Every step ended as asked;" +
               took + "</p>";
    if (status == "not cleared")
        return "<p class=\"outcome open\"><strong>Not cleared.</strong> A step ran into its time "
               "limit before it reached what it was to reach;" +
               took + "</p>";
    if (status == "interrupted")
        return "<p class=\"outcome stopped\"><strong>Interrupted</strong> before the end of the "
               "recipe. Everything here is of the moment of the stop;" +
               took + resume + "</p>";
    return "<p class=\"outcome failed\"><strong>Failed.</strong> " +
           escaped(record.value("failure", "no reason is recorded")) +
           ". Shown is the state before that;" + took + "</p>";
}

std::string asked_html(const RunParts& p) {
    std::string html = "<dl class=\"facts\">\n";
    const auto fact = [&](const std::string& name, const std::string& text) {
        html += "<dt>" + escaped(name) + "</dt><dd>" + escaped(text) + "</dd>\n";
    };
    fact("Openings", openings_text(p.c));
    fact("Stack", stack_text(p.c));
    std::string plasmas;
    for (const auto& entry : p.c.plasmas)
        plasmas += (plasmas.empty() ? "" : "; ") + plasma_text(entry.second);
    fact("Plasma", plasmas);
    fact("Chemistry",
         p.c.chemistry + fmt::format(", wafer at {:.4g} °C", p.c.wafer_temperature_k - 273.15));
    for (std::size_t i = 0; i < p.c.steps.size(); ++i)
        fact("Step " + p.c.steps[i].name, step_text(p.c.steps[i]) + " → " + step_outcome(p, i));
    return html + "</dl>\n";
}

std::string results_html(const RunParts& p) {
    if (!p.folder.has_metrics)
        return "<p>Nothing has been measured: the folder holds neither metrics nor frames.</p>";
    const Metrics& metrics = p.folder.metrics;
    std::vector<std::string> names;
    for (const bool cds : {true, false}) // CDs first
        for (const Metric& m : metrics.metrics) {
            const bool cd = m.name.find(" cd") != std::string::npos;
            if (is_key(m.name) && cd == cds &&
                std::find(names.begin(), names.end(), m.name) == names.end())
                names.push_back(m.name);
        }
    const auto& openings = p.c.mask.openings;
    DataTable table;
    table.id = "key-results";
    table.columns = {{openings.size() > 1 ? "opening" : "quantity", false, "", true}};
    if (openings.size() > 1) { // a row an opening
        for (const std::string& name : names)
            table.columns.push_back({metric_label(name), true});
        for (const geometry::Opening& opening : openings) {
            table.rows.push_back({{opening.name}});
            for (const std::string& name : names)
                table.rows.back().push_back(value_cell(metrics.find(name, opening.name)));
        }
    } else {
        table.columns.push_back({"value", true});
        for (const std::string& name : names)
            table.rows.push_back({{metric_label(name)}, value_cell(metrics.find(name))});
    }
    return table_html(table) +
           "<p class=\"soft small\">± is the 95 % sampling error; the error of the grid and the "
           "uncertainty of the parameters are not assessed. <a href=\"#measured\">All quantities "
           "and their definitions</a></p>\n";
}

std::string targets_html(const RunParts& p) {
    const Metrics& metrics = p.folder.metrics;
    if (metrics.targets.empty()) return "<p class=\"soft\">The case states no targets.</p>";
    const bool several = p.c.mask.openings.size() > 1;
    DataTable table;
    table.id = "targets";
    table.columns = {{"target", false, "", true}, {"value", true}, {"by the numbers"}, {"verdict"}};
    std::set<std::string> reasons;
    for (const TargetVerdict& v : metrics.targets) {
        const Metric then{v.metric, v.feature, v.value, v.unit, v.sampling_error, "", ""};
        const Metric* shown = v.after.empty() ? metrics.find(v.metric, v.feature) : &then;
        const std::string word = verdict_name(v.verdict);
        table.rows.push_back(
            {{several && !v.feature.empty() ? v.feature + ": " + v.target : v.target},
             value_cell(shown),
             {verdict_name(v.by_numbers)},
             {word, "", "<span class=\"verdict " + word + "\">" + word + "</span>"}});
        if (!metrics.is_final && v.after.empty()) continue; // said once, below
        const std::size_t but = v.reason.find(", but ");
        if (v.verdict != v.by_numbers && but != std::string::npos)
            reasons.insert("Undecided: " + v.reason.substr(but + 6));
        else if (!v.value)
            reasons.insert(v.target + ": " + v.reason);
    }
    std::string html = table_html(table);
    if (!metrics.is_final)
        html += "<p class=\"soft small\">The run has not come to its end: what is due then stays "
                "undecided, whatever the numbers say now.</p>\n";
    for (const std::string& reason : reasons)
        html += "<p class=\"soft small\">" + escaped(reason) + ".</p>\n";
    return html;
}

std::string standing_html(const RunParts& p) {
    std::vector<std::pair<std::string, int>> counts;
    int total = 0;
    for (const auto& [standing, word] :
         {std::pair(fluxes::Standing::measured, "measured"),
          std::pair(fluxes::Standing::published, "published"),
          std::pair(fluxes::Standing::from_memory, "from memory"),
          std::pair(fluxes::Standing::illustrative, "illustrative")}) {
        const auto found = p.c.standing.find(standing);
        counts.emplace_back(word, found == p.c.standing.end() ? 0 : found->second);
        total += counts.back().second;
    }
    std::string html = total > 0 ? standing_bar(counts) : "";
    html += "<p id=\"standing\">Of " + std::to_string(total) + " parameters: ";
    for (std::size_t i = 0; i < counts.size(); ++i)
        html += fmt::format("{}<b>{}</b> {}", i ? ", " : "", counts[i].second, counts[i].first);
    return html + ".</p>\n";
}

} // namespace rille::engine
