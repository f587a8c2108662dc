// SPDX-License-Identifier: Apache-2.0
// What a run's report tells in words and tables below its first screen.
#include "engine/number_text.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using nlohmann::json;

class Facts {
public:
    void add(const std::string& name, const std::string& text) {
        if (!text.empty())
            html_ += "<dt>" + escaped(name) + "</dt><dd>" + escaped(text) + "</dd>\n";
    }
    std::string html() const { return "<dl class=\"facts\">\n" + html_ + "</dl>\n"; }

private:
    std::string html_;
};

std::string joined(const json& list) {
    std::string text;
    for (const json& item : list)
        text += (text.empty() ? "" : ", ") + item.get<std::string>();
    return text;
}

std::string list_html(const std::vector<std::string>& items) {
    std::string html = "<ul>\n";
    for (const std::string& item : items)
        html += "<li>" + escaped(item) + "</li>\n";
    return html + "</ul>\n";
}

std::string clearing_table(const RunParts& p) {
    DataTable table;
    table.id = "clearing";
    table.caption = "Films on the way down";
    table.columns = {{"opening", false, "", true}, {"film"}, {"state"}, {"left (nm)", true}};
    for (const Metrics::Clearing& film : p.folder.metrics.clearing)
        table.rows.push_back({{film.feature},
                              {film.film},
                              {film.cleared ? "cleared" : "not cleared"},
                              {rounded(film.cleared ? 0 : film.remaining_nm),
                               shortest(film.cleared ? 0 : film.remaining_nm)}});
    return table.rows.empty() ? "" : table_html(table);
}

std::string inputs_text(const json& record) {
    std::string text;
    for (const json& input : record.value("inputs", json::array()))
        text += (text.empty() ? "" : "; ") + input.value("file", "") + " (sha256 " +
                input.value("sha256", "").substr(0, 12) + "…)";
    return text;
}

std::string count_text(double value) {
    return value >= 1e6 ? fmt::format("{:.3g} million", value / 1e6) : fmt::format("{:.0f}", value);
}

DataTable::Cell error_cell(double error) {
    return {error > 0 && error < 0.005 ? "<0.01" : rounded(error, error), shortest(error)};
}

} // namespace

PageSection measured_section(const RunParts& p) {
    PageSection section{"measured", "All that was measured", "", false, "Measured"};
    if (!p.folder.has_metrics) return section;
    const bool several = p.c.mask.openings.size() > 1;
    DataTable table;
    table.id = "metrics";
    if (several) table.columns.push_back({"opening"});
    table.columns.insert(table.columns.end(), {{"quantity", false, "", true},
                                               {"value", true},
                                               {"± sampling (95 %)", true},
                                               {"± grid (bound)", true},
                                               {"unit"},
                                               {"definition", false, "definition"}});
    for (const Metric& m : p.folder.metrics.metrics) {
        std::vector<DataTable::Cell> row;
        if (several) row.push_back({m.feature});
        row.push_back({metric_label(m.name), m.name});
        if (m.value) {
            row.push_back({rounded(*m.value, m.error()), shortest(*m.value)});
            row.push_back(error_cell(m.sampling_error));
            row.push_back(m.grid_error ? error_cell(*m.grid_error)
                                       : DataTable::Cell{"not assessed"});
        } else {
            row.insert(row.end(), {{"none"}, {""}, {""}});
        }
        row.push_back({m.unit == "1" ? "" : m.unit});
        row.push_back({m.value ? m.definition : m.note + ". " + m.definition});
        table.rows.push_back(row);
    }
    section.html =
        table_html(table) +
        "<p class=\"soft small\">The sampling error is that of 95 %, from eight independent "
        "batches. " +
        (p.folder.metrics.has_grid_errors()
             ? "The grid error is a bound, from the same case on coarser grids. "
             : "The error of the grid is not assessed: <code>--set grid_error=assessed</code> "
               "runs the case on coarser grids too. ") +
        "The uncertainty of the parameters is not assessed.</p>\n" + clearing_table(p);
    return section;
}

PageSection case_section(const RunParts& p) {
    return {"case", "The case in full",
            "<p>Every default is filled in; with the folder's <code>inputs/</code> it runs "
            "again.</p>\n<pre id=\"case-text\">" +
                escaped_lines(p.c.resolved_yaml) + "</pre>\n",
            true, "Case"};
}

PageSection origin_section(const RunParts& p) {
    PageSection section{"origin", "Where this comes from", "", false, "Origin"};
    const json& r = p.folder.record;
    if (!r.is_object()) {
        section.html = "<p>The run left no record of its program and machine.</p>";
        return section;
    }
    Facts facts;
    const json program = r.value("program", json::object());
    facts.add("Program", program.value("name", "") + " " + program.value("version", "") + " (" +
                             program.value("revision", "") + "), " + program.value("build", ""));
    facts.add("Command", r.value("command", ""));
    facts.add("Case file", r.value("case_file", ""));
    facts.add("Case, sha256", r.value("case_sha256", ""));
    facts.add("Tables read", inputs_text(r));
    facts.add("Started", r.value("started", ""));
    if (r.value("resumed", 0) > 0)
        facts.add("Taken up after a stop", fmt::format("{} times", r.value("resumed", 0)));
    facts.add("Seed", std::to_string(r.value("seed", std::uint64_t(0))));
    const json machine = r.value("machine", json::object());
    facts.add("Threads", std::to_string(machine.value("threads", 0)) +
                             " (the result does not depend on them)");
    facts.add("Processor features", joined(machine.value("cpu_features", json::array())) +
                                        " (the same bits where these agree)");
    const json numerics = r.value("numerics", json::object());
    facts.add("Grid", fmt::format("{:.4g} nm, ", numerics.value("spacing_nm", 0.0)) +
                          count_text(numerics.value("voxels", 0.0)) + " voxels, " +
                          count_text(numerics.value("surface_elements", 0.0)) +
                          " surface elements at the end");
    facts.add("Rays", count_text(numerics.value("rays", 0.0)) + ", of which " +
                          count_text(numerics.value("lost_rays", 0.0)) + " were lost");
    std::vector<std::string> unused;
    const json by_plasma = r.value("/not_used/plasmas"_json_pointer, json::object());
    for (const auto& entry : by_plasma.items())
        for (const json& set_point : entry.value())
            unused.push_back(entry.key() + ", " + set_point.get<std::string>());
    for (const json& line : r.value("/not_used/tool_log"_json_pointer, json::array()))
        unused.push_back(line.get<std::string>());
    section.html = facts.html();
    if (!unused.empty())
        section.html +=
            "<h3>Kept with the result, not used by the model</h3>\n" + list_html(unused);
    return section;
}

std::vector<std::string> all_warnings(const RunParts& p) {
    std::vector<std::string> all = p.c.warnings;
    if (p.folder.record.is_object())
        for (const json& warning : p.folder.record.value("warnings", json::array())) {
            const std::string text = warning.get<std::string>();
            if (std::find(all.begin(), all.end(), text) == all.end()) all.push_back(text);
        }
    return all;
}

PageSection warnings_section(const RunParts& p) {
    const std::vector<std::string> warnings = all_warnings(p);
    std::string html = warnings.empty()
                           ? "<p>The run raised no warning.</p>\n"
                           : "<div class=\"warning\">" + list_html(warnings) + "</div>\n";
    html += "<h3>What no number here contains</h3>\n" +
            list_html({"the error of the grid: run half the spacing to see it",
                       "the uncertainty of the parameters: fit them to flat-film rates of your own",
                       "what is not modelled: charging, redeposition of by-products, gas-phase "
                       "collisions inside a feature"});
    return {"warnings", "Warnings and limits", html, false, "Warnings"};
}

} // namespace rille::engine
