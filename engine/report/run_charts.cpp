// SPDX-License-Identifier: Apache-2.0
// What a run's report shows as curves and bars.
#include "engine/number_text.hpp"
#include "engine/report/chart.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/report/section_sheet.hpp"
#include "engine/sheath_figures.hpp"
#include "engine/sheath_model.hpp"
#include "engine/sheath_output.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr int energy_bins = 120, angle_points = 100;
constexpr std::size_t most_openings = 6; ///< that a chart keeps apart
constexpr int rate_spans = 25;
constexpr double drawn_to = 1e-3; ///< a curve may leave its points by this share of its height

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

/// A chart in a row of charts, with its slide.
template <class Chart>
std::string show_chart(const RunParts& p, Chart chart, const std::string& id,
                       const std::string& title, const std::string& caption) {
    chart.text.id = id;
    chart.text.title = title;
    chart.text.subtitle = p.c.title;
    Figure figure;
    figure.id = id;
    figure.svg = chart_svg(chart, FigureForm::narrow);
    chart.text.id = id + "-slide";
    figure.slide = chart_svg(chart, FigureForm::slide);
    figure.caption = caption;
    return p.show(figure);
}

ChartPoint at(double x, double y) {
    ChartPoint point;
    point.x = x;
    point.y = y;
    return point;
}

ChartLine curve(const std::string& name) {
    ChartLine line;
    line.name = name;
    line.has_markers = false;
    return line;
}

/// The particles of a plasma that hit with energy, each with the name of its line.
std::vector<std::pair<std::string, const fluxes::IonDistribution*>>
energetic(const Plasma& plasma) {
    std::vector<std::pair<std::string, const fluxes::IonDistribution*>> particles;
    if (!plasma.arrivals) return particles;
    for (const IonAtWafer& ion : plasma.arrivals->ions) {
        particles.emplace_back(ion.name, &ion.ions.front());
        for (const auto& fast : ion.fast_neutrals)
            particles.emplace_back("fast neutrals of " + ion.name, &fast);
    }
    return particles;
}

std::string energy_chart(const RunParts& p, const Plasma& plasma) {
    double highest = 0;
    for (const auto& [name, distribution] : energetic(plasma))
        highest = std::max(highest, figures_of(*distribution).high_ev);
    LineChart chart;
    chart.x = {"energy at the wafer", "eV", false, 0, 1.15 * highest, true, {}};
    chart.y = {"share of the flux per eV", "", false, {}, {}, true, {}};
    for (const auto& [name, distribution] : energetic(plasma)) {
        chart.lines.push_back(curve(name));
        const Spectrum spectrum = energy_spectrum(*distribution, highest / energy_bins);
        for (std::size_t b = 0; b < spectrum.share.size(); ++b) {
            if (spectrum.edges[b] > 1.15 * highest) break;
            const double width = spectrum.edges[b + 1] - spectrum.edges[b];
            for (const double edge : {spectrum.edges[b], spectrum.edges[b + 1]})
                chart.lines.back().points.push_back(at(edge, spectrum.share[b] / width));
        }
    }
    return show_chart(
        p, chart, "ion-energies-" + id_of(plasma.name),
        "Energies at the wafer, plasma " + plasma.name,
        "Energies of what hits the wafer; voltages are those of a model, not permitted "
        "settings of a tool.");
}

std::string angle_chart(const RunParts& p, const Plasma& plasma) {
    double widest = 0.05;
    for (const auto& [name, distribution] : energetic(plasma))
        while (widest < 90 && distribution->share_within_deg(widest) < 0.98)
            widest *= 1.1;
    widest = std::min(widest, 90.0);
    LineChart chart;
    chart.x = {"angle from the wafer normal", "deg", false, 0, widest, true, {}};
    chart.y = {"share of the flux within", "%", false, {}, {}, true, {}};
    for (const auto& [name, distribution] : energetic(plasma)) {
        chart.lines.push_back(curve(name));
        for (int i = 0; i <= angle_points; ++i) {
            const double angle = widest * i / angle_points;
            chart.lines.back().points.push_back(
                at(angle, 100 * distribution->share_within_deg(angle)));
        }
    }
    return show_chart(p, chart, "ion-angles-" + id_of(plasma.name),
                      "Angles at the wafer, plasma " + plasma.name,
                      "Share of the flux within each angle.");
}

/// Columns of the history that show the same quantity, one a line.
struct Quantity {
    std::string id, title, axis, unit;
    std::vector<std::pair<std::string, std::string>> columns; ///< name of the line, column
    std::vector<std::pair<double, std::string>> levels;       ///< limits of targets
};

/// Limits that the targets set for a metric.
void add_levels(const Case& c, const std::string& metric, Quantity& quantity) {
    for (const Target& target : c.targets) {
        if (target.metric != metric && target.metric.rfind(metric + " of ", 0) != 0) continue;
        const std::string of =
            metric_label(metric) + (target.after.empty() ? "" : " after " + target.after);
        if (target.at_least) quantity.levels.emplace_back(*target.at_least, of + ", at least");
        if (target.at_most) quantity.levels.emplace_back(*target.at_most, of + ", at most");
    }
}

std::vector<Quantity> quantities(const Case& c) {
    Quantity depth{"depth", "Depth", "depth on the axis", "nm", {}, {}};
    Quantity cds{"cds", "CDs", "full width", "nm", {}, {}};
    Quantity mask{"mask-left", "Mask left", "mask left", "nm", {}, {}};
    const std::size_t openings = std::min(c.mask.openings.size(), most_openings);
    for (std::size_t f = 0; f < openings; ++f) {
        const std::string name = history_name(c, f);
        const std::string label = c.mask.openings.size() > 1 ? name : "";
        depth.columns.emplace_back(label, name + "_depth_centre_nm");
        mask.columns.emplace_back(label, name + "_mask_left_nm");
        for (const std::string& place : places_from_the_top(c))
            cds.columns.emplace_back((label.empty() ? "" : label + ", ") + place,
                                     name + "_cd_" + column_name(place) + "_nm");
    }
    add_levels(c, "depth centre", depth);
    add_levels(c, "mask left", mask);
    for (const auto& place : c.cd_places)
        add_levels(c, place.first + " cd", cds);
    return {depth, cds, mask};
}

/// A line through (x, y) with no more points than a drawing shows.
ChartLine history_line(const std::string& name, const std::vector<double>& x,
                       const std::vector<double>& y) {
    ChartLine line = curve(name);
    std::vector<std::array<double, 2>> points;
    double low = INFINITY, high = -INFINITY, right = 0;
    for (std::size_t r = 0; r < x.size(); ++r) {
        if (!std::isfinite(x[r]) || !std::isfinite(y[r])) continue;
        points.push_back({x[r], y[r]});
        low = std::min(low, y[r]);
        high = std::max(high, y[r]);
        right = std::max(right, x[r]);
    }
    const double scale_x = right > 0 ? 1 / right : 1, scale_y = high > low ? 1 / (high - low) : 1;
    for (auto& point : points)
        point = {point[0] * scale_x, point[1] * scale_y};
    for (const auto& point : thinned(points, drawn_to))
        line.points.push_back(at(point[0] / scale_x, point[1] / scale_y));
    return line;
}

/// The quantity against the column `across`; empty if there is nothing to draw.
std::string history_chart(const RunParts& p, const Quantity& quantity, const ChartAxis& axis,
                          const std::string& across, const std::string& against) {
    const std::vector<double>* x = p.folder.history.find(across);
    if (!x) return "";
    LineChart chart;
    chart.x = axis;
    chart.y = {quantity.axis, quantity.unit, false, {}, {}, false, {}};
    chart.levels = quantity.levels;
    bool any = false;
    for (const auto& [name, column] : quantity.columns) {
        const std::vector<double>* y = p.folder.history.find(column);
        if (!y) continue;
        chart.lines.push_back(history_line(name, *x, *y));
        any = any || chart.lines.back().points.size() > 1;
    }
    if (!any) return "";
    return show_chart(p, chart, quantity.id + "-against-" + against,
                      quantity.title + " against " + against, "");
}

/// The value of a line of points (rising x) at x.
double interpolated(const std::vector<std::array<double, 2>>& points, double x) {
    const auto after = std::lower_bound(points.begin(), points.end(), x,
                                        [](const auto& p, double value) { return p[0] < value; });
    if (after == points.begin()) return points.front()[1];
    if (after == points.end()) return points.back()[1];
    const auto before = after - 1;
    const double width = (*after)[0] - (*before)[0];
    return width > 0 ? (*before)[1] + ((*after)[1] - (*before)[1]) * (x - (*before)[0]) / width
                     : (*after)[1];
}

/// Etch rate on the axis against depth: slopes of the depth over even spans of time, since single
/// refreshes scatter.
std::string rate_chart(const RunParts& p) {
    LineChart chart;
    chart.x = {"depth on the axis", "nm", false, 0, {}, true, {}};
    chart.y = {"etch rate on the axis", "nm/min", false, {}, {}, true, {}};
    chart.text.notes = {fmt::format("Mean over spans of 1/{} of the time.", rate_spans)};
    const std::vector<double>* times = p.folder.history.find("time_s");
    for (std::size_t f = 0; f < std::min(p.c.mask.openings.size(), most_openings); ++f) {
        const std::string name = history_name(p.c, f);
        const std::vector<double>* depths = p.folder.history.find(name + "_depth_centre_nm");
        if (!times || !depths) return "";
        std::vector<std::array<double, 2>> points;
        for (std::size_t r = 0; r < times->size(); ++r)
            if (std::isfinite((*depths)[r])) points.push_back({(*times)[r], (*depths)[r]});
        if (points.size() < 2 * rate_spans) return "";
        chart.lines.push_back(curve(p.c.mask.openings.size() > 1 ? name : ""));
        const double span = (points.back()[0] - points.front()[0]) / rate_spans;
        for (int i = 0; i < rate_spans; ++i) {
            const double start = points.front()[0] + i * span;
            const double low = interpolated(points, start),
                         high = interpolated(points, start + span);
            chart.lines.back().points.push_back(at(0.5 * (low + high), 60 * (high - low) / span));
        }
    }
    return show_chart(p, chart, "rate-against-depth", "Etch rate against depth", "");
}

} // namespace

PageSection arrivals_section(const RunParts& p) {
    PageSection section{"arrivals", "What reaches the wafer", "", false, "Arrivals"};
    const json arrivals = sheath_json(p.c);
    for (const json& told : arrivals.at("plasmas")) {
        const Plasma& plasma = p.c.plasmas.at(told.at("name"));
        section.html += "<h3>Plasma " + escaped(plasma.name) + "</h3>\n" + phases_text(told) +
                        particles_table(told);
        if (!energetic(plasma).empty())
            section.html += "<div class=\"charts\">\n" + energy_chart(p, plasma) +
                            angle_chart(p, plasma) + "</div>\n";
    }
    return section;
}

PageSection curves_section(const RunParts& p) {
    PageSection section{"curves", "Curves", "", false, ""};
    if (p.folder.history.rows() < 2 || p.c.mask.openings.empty()) return section;
    const ChartAxis time{"time", "s", false, 0, {}, true, {}};
    const ChartAxis depth{"depth on the axis", "nm", false, 0, {}, true, {}};
    const std::string first = history_name(p.c, 0) + "_depth_centre_nm";
    std::string over_time, over_depth;
    for (const Quantity& quantity : quantities(p.c)) {
        over_time += history_chart(p, quantity, time, "time_s", "time");
        if (quantity.id != "depth") over_depth += history_chart(p, quantity, depth, first, "depth");
    }
    over_depth += rate_chart(p);
    if (over_time.empty()) return section;
    section.html = "<h3>Against time</h3>\n<div class=\"charts\">\n" + over_time + "</div>\n";
    if (!over_depth.empty())
        section.html += "<h3>Against the depth" +
                        (p.c.mask.openings.size() > 1 ? " of " + escaped(history_name(p.c, 0))
                                                      : std::string()) +
                        "</h3>\n<div class=\"charts\">\n" + over_depth + "</div>\n";
    if (p.c.mask.openings.size() > most_openings)
        section.html += fmt::format(
            "<p>Drawn are the first {} openings; history.csv has all.</p>\n", most_openings);
    return section;
}

PageSection cost_section(const RunParts& p) {
    PageSection section{"cost", "Where the time went", "", false, "Cost"};
    if (!p.folder.record.is_object()) return section;
    const json timings = p.folder.record.value("timings", json::object());
    const double wall = p.folder.record.value("/machine/wall_seconds"_json_pointer, 0.0);
    if (timings.empty() || !(wall > 0)) return section;
    DataTable table;
    table.id = "timings";
    table.columns = {{"part", false, "", true}, {"time (s)", true}, {"share (%)", true}};
    BarChart chart;
    chart.axis_title = "computing time (s)";
    for (const auto& entry : timings.items()) {
        const double seconds = entry.value();
        std::string name = entry.key().substr(0, entry.key().size() - 2);
        std::replace(name.begin(), name.end(), '_', ' ');
        table.rows.push_back({{name}, number(seconds), number(100 * seconds / wall)});
        chart.bars.push_back({name, seconds, 0, plain(100 * seconds / wall, "{:.0f}") + " %"});
    }
    table.rows.push_back({{"all"}, number(wall), {"100"}});
    section.html = "<div class=\"charts\">\n" +
                   show_chart(p, chart, "computing-time", "Where the time went", "") + "<div>" +
                   table_html(table) + "</div></div>\n";
    return section;
}

} // namespace rille::engine
