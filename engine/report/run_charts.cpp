// SPDX-License-Identifier: Apache-2.0
// What a run's report shows as curves and bars.
#include "engine/number_text.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/sheath_model.hpp"
#include "engine/sheath_output.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using nlohmann::json;

std::string plain(double value, const char* form = "{:.4g}") {
    return fmt::format(fmt::runtime(form), value);
}

DataTable::Cell number(const json& value) {
    return {plain(value.get<double>()), shortest(value.get<double>())};
}

std::string phases_text(const json& plasma) {
    std::string html;
    for (const json& phase : plasma.at("phases")) {
        const std::string name = phase.value("name", "");
        std::string text = name.empty() ? "Sheath: " : "Sheath, bias " + name + ": ";
        text += plain(1e-6 * phase.at("thickness_nm").get<double>(), "{:.3g}") + " mm thick (" +
                phase.value("width_law", "") + "), ";
        const double low = phase.at("lowest_V"), high = phase.at("highest_V");
        text += high - low > 1e-6 * std::max(1.0, high)
                    ? plain(low, "{:.3g}") + " to " + plain(high, "{:.3g}") + " V, mean " +
                          plain(phase.at("mean_V"), "{:.3g}") + " V."
                    : "steady " + plain(high, "{:.3g}") + " V.";
        html += "<p>" + escaped(text) + "</p>\n";
    }
    return html;
}

std::string particles_table(const json& plasma) {
    DataTable table;
    table.id = "particles-" + id_of(plasma.value("name", ""));
    table.columns = {{"particle", false, "", true}, {"flux (/cm²/s)", true},
                     {"mean energy (eV)", true},    {"5 % (eV)", true},
                     {"95 % (eV)", true},           {"median angle (deg)", true},
                     {"angle, FWHM (deg)", true},   {"found by"}};
    for (const json& p : plasma.at("particles"))
        table.rows.push_back({{p.value("particle", "")},
                              number(1e14 * p.at("flux_per_nm2_s").get<double>()),
                              number(p.at("mean_energy_eV")),
                              number(p.at("energy_5_percent_eV")),
                              number(p.at("energy_95_percent_eV")),
                              number(p.at("median_angle_deg")),
                              number(p.at("angle_fwhm_deg")),
                              {p.value("found_by", "")}});
    for (const json& n : plasma.at("neutrals"))
        table.rows.push_back({{n.value("particle", "")},
                              number(1e14 * n.at("flux_per_nm2_s").get<double>()),
                              {""},
                              {""},
                              {""},
                              {""},
                              {""},
                              {"thermal at " + plain(n.at("temperature_K")) + " K"}});
    return table.rows.empty() ? "<p>Nothing arrives.</p>\n" : table_html(table);
}

bool any_ions(const Case& c) {
    return std::any_of(c.plasmas.begin(), c.plasmas.end(), [](const auto& entry) {
        return entry.second.arrivals && !entry.second.arrivals->ions.empty();
    });
}

} // namespace

PageSection arrivals_section(const RunParts& p) {
    PageSection section{"arrivals", "What reaches the wafer", "", false};
    if (any_ions(p.c)) {
        Figure figure;
        figure.id = "ions-at-the-wafer";
        figure.svg = sheath_picture_svg(p.c);
        figure.least_width = 760;
        figure.caption =
            "Energies and angles of what hits the wafer. Voltages are those of a model, "
            "not permitted settings of a tool.";
        section.html += p.show(figure);
    }
    const json arrivals = sheath_json(p.c);
    for (const json& plasma : arrivals.at("plasmas"))
        section.html += "<h3>Plasma " + escaped(plasma.value("name", "")) + "</h3>\n" +
                        phases_text(plasma) + particles_table(plasma);
    return section;
}

PageSection curves_section(const RunParts&) {
    return {"curves", "Curves", "", false};
}

PageSection cost_section(const RunParts& p) {
    PageSection section{"cost", "Where the time went", "", false};
    if (!p.folder.record.is_object()) return section;
    const json timings = p.folder.record.value("timings", json::object());
    const double wall = p.folder.record.value("/machine/wall_seconds"_json_pointer, 0.0);
    if (timings.empty() || !(wall > 0)) return section;
    DataTable table;
    table.id = "timings";
    table.columns = {{"part", false, "", true}, {"time (s)", true}, {"share (%)", true}};
    for (const auto& entry : timings.items()) {
        const double seconds = entry.value();
        std::string name = entry.key().substr(0, entry.key().size() - 2);
        std::replace(name.begin(), name.end(), '_', ' ');
        table.rows.push_back({{name}, number(seconds), number(100 * seconds / wall)});
    }
    table.rows.push_back({{"all"}, number(wall), {"100"}});
    section.html = table_html(table);
    return section;
}

} // namespace rille::engine
