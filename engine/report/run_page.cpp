// SPDX-License-Identifier: Apache-2.0
#include "engine/report/run_page.hpp"

#include "engine/case.hpp"
#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/output_names.hpp"
#include "engine/picture_parts.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/report/section_sheet.hpp"
#include "engine/svg.hpp"
#include "engine/vtk_files.hpp"

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr std::size_t most_moments = 40, drawn_fronts = 8;
constexpr double slide_width = 1920, slide_height = 1080;

/// At most `most` of `count` items, evenly, with the first and the last.
std::vector<std::size_t> spread(std::size_t count, std::size_t most) {
    std::vector<std::size_t> chosen;
    const std::size_t taken = std::min(count, most);
    for (std::size_t i = 0; i < taken; ++i)
        chosen.push_back(taken == 1 ? count - 1 : i * (count - 1) / (taken - 1));
    return chosen;
}

/// What the frames give: pictures of the first screen and of the slider.
struct Frames {
    SurfaceState last;
    std::vector<PictureFront> fronts;
    std::string timeline;
    std::vector<HistoryRow> moments; ///< what is read off the surface at each
};

Frames read_frames(const Case& c, const std::vector<std::string>& files) {
    Frames frames;
    frames.last = read_vtp(c, files.back());
    Timeline timeline(c, read_vtp(c, files.front()), frames.last);
    const std::vector<std::size_t> chosen = spread(files.size(), most_moments);
    const std::vector<std::size_t> drawn = spread(chosen.size(), drawn_fronts);
    for (std::size_t i = 0; i < chosen.size(); ++i) {
        const SurfaceState state = read_vtp(c, files[chosen[i]]);
        timeline.add(state);
        frames.moments.emplace_back();
        frames.moments.back().time_s = state.time_s;
        measure_row(c, state.surface, frames.moments.back());
        if (std::find(drawn.begin(), drawn.end(), i) != drawn.end())
            frames.fronts.push_back(
                {state.time_s, vertical_section(c.domain, state.surface, section_y(c))});
    }
    frames.timeline = timeline.finish();
    return frames;
}

/// The recipe step that a time falls into, as the record has it; empty if it does not say.
std::string step_at(const json& record, double time_s) {
    if (!record.is_object()) return "";
    for (const json& step : record.value("steps", json::array()))
        if (time_s <= step.value("end_s", 0.0) * (1 + 1e-12)) return step.value("name", "");
    return "";
}

std::string length_text(const std::optional<double>& nm) {
    return nm ? rounded(*nm, 0.1) + " nm" : "none";
}

/// What is read beside the slider: [{time, step, values: [[label, text], ...]}, ...].
json moments_json(const RunParts& p, const Frames& frames) {
    json moments = json::array();
    for (const HistoryRow& row : frames.moments) {
        json values = json::array();
        for (std::size_t f = 0; f < std::min<std::size_t>(row.features.size(), 3); ++f) {
            const FeatureRow& read = row.features[f];
            const std::string of =
                p.c.mask.openings.size() > 1 ? p.c.mask.openings[f].name + ": " : "";
            values.push_back({of + "depth", length_text(read.depth_centre)});
            for (const std::string& place : places_from_the_top(p.c)) {
                const auto at = std::distance(p.c.cd_places.begin(), p.c.cd_places.find(place));
                values.push_back(
                    {of + place + " CD", length_text(at < static_cast<long>(read.cd.size())
                                                         ? read.cd[at]
                                                         : std::optional<double>())});
            }
            values.push_back({of + "mask left", length_text(read.mask_left)});
        }
        moments.push_back({{"time", time_text(row.time_s)},
                           {"step", step_at(p.folder.record, row.time_s)},
                           {"values", values}});
    }
    return moments;
}

std::string slider_html(std::size_t moments) {
    return fmt::format(
        "<div class=\"slider\" data-moments=\"moments\"><button type=\"button\" class=\"play\">"
        "Play</button><label>Moment <input type=\"range\" min=\"0\" max=\"{0}\" value=\"{0}\" "
        "step=\"1\" aria-label=\"moment of the etch\"></label><output></output></div>\n",
        moments - 1);
}

/// What each cause has removed, as the run drew it at its end.
PageSection causes_section(const RunParts& p) {
    PageSection section{"causes", "What made the shape", "", false, "Causes"};
    const std::filesystem::path path =
        std::filesystem::path(p.folder.path) / output_names::causes_svg;
    if (!std::filesystem::exists(path)) return section;
    Figure figure;
    figure.id = "causes-of-shape";
    figure.svg = read_file(path.string());
    figure.least_width = 700;
    figure.caption =
        "How far each cause has moved the walls at every height, and the floor at every "
        "place across, since they were first there. Dashed: the way of the surface "
        "itself; what the causes leave of it is an error of grid and steps.";
    section.html =
        p.show(figure) +
        "<p class=\"soft small\">Ions are followed by their path: straight from the plasma, or "
        "after bounces off other places. Hatched: sputtering; plain: etching that ions enhance; "
        "deposition counts less than 0. A place that neutrals starve answers to ions less than "
        "its share says: the supply columns of <code>causes.csv</code> give flux times "
        "d(rate)/d(flux), summed over the run.</p>\n";
    return section;
}

PageSection time_section(const RunParts& p, const Frames& frames, Page& page) {
    PageSection section{"over-time", "The profile over time", "", false, "Over time"};
    if (frames.moments.size() < 2) return section;
    Figure figure;
    figure.id = "profile-over-time";
    figure.svg = frames.timeline;
    figure.caption =
        "The cross-section at the moment chosen; dashed: the start. The arrow keys move "
        "the slider.";
    figure.controls = slider_html(frames.moments.size());
    page.data.push_back({"moments", moments_json(p, frames).dump()});
    section.html = "<div class=\"sides\"><div>" + p.show(figure) +
                   "</div><div><table class=\"moment-values\" aria-live=\"off\"><caption></caption>"
                   "<tbody></tbody></table></div></div>\n";
    return section;
}

std::string picture_html(const RunParts& p, const Frames* frames) {
    if (!frames)
        return "<p class=\"outcome\">No frames are kept in this folder: there is no picture.</p>";
    Figure figure;
    figure.id = "profile";
    figure.svg = section_sheet(p.c, frames->fronts, frames->last, p.folder.metrics);
    figure.slide = picture_svg(p.c, frames->fronts, frames->last, p.folder.metrics);
    figure.caption = p.folder.frames.size() < 2 ? "The profile."
                     : p.folder.is_stopped()
                         ? "The profile where the run stopped, over the fronts before it."
                         : "The profile at the end, over the fronts before it.";
    return p.show(figure);
}

std::string summary_html(const RunParts& p, const Frames* frames) {
    std::string warnings;
    if (const std::size_t count = all_warnings(p).size())
        warnings = fmt::format("<p class=\"warning\"><a href=\"#warnings\">{} warning{}</a></p>\n",
                               count, count == 1 ? "" : "s");
    return "<div class=\"sides first\">\n<div>\n" + picture_html(p, frames) + "</div>\n<div>\n" +
           outcome_html(p) + warnings + "<div class=\"sides\"><div><h2>" +
           (p.folder.is_stopped() ? "Where it stands" : "What came out") + "</h2>\n" +
           results_html(p) + "</div>\n<div><h2>What was asked</h2>\n" + asked_html(p) +
           "</div></div>\n<h2>Targets</h2>\n" + targets_html(p) + "<h2>What it rests on</h2>\n" +
           standing_html(p) + "<p class=\"caution\">" + escaped(caution) + "</p>\n</div>\n</div>\n";
}

} // namespace

RunReport run_report(const Case& c, const RunFolder& folder) {
    RunReport report;
    Page& page = report.page;
    const RunParts parts{c, folder, report.figures};
    page.kind = !folder.is_stopped() ? "Run"
                : folder.record.is_object() && folder.record.value("status", "") == "failed"
                    ? "Run that failed"
                    : "Run, not at its end";
    page.title = c.title;
    page.styles = {"run.css"};
    page.scripts = {"run.js"};
    std::optional<Frames> frames;
    if (!folder.frames.empty()) frames = read_frames(c, folder.frames);
    page.summary = summary_html(parts, frames ? &*frames : nullptr);
    std::vector<PageSection> sections;
    if (frames) {
        sections.push_back(time_section(parts, *frames, page));
        sections.push_back(causes_section(parts));
        sections.push_back(surface_section(parts, frames->last, page));
        sections.push_back(comparison_section(parts, compare_measured(c, frames->last)));
    }
    for (const auto make : {curves_section, arrivals_section, measured_section, cost_section,
                            warnings_section, case_section, origin_section})
        sections.push_back(make(parts));
    for (PageSection& section : sections)
        if (!section.html.empty()) page.sections.push_back(std::move(section));
    return report;
}

std::string slide_of(const std::string& svg) {
    const std::string inner = inline_svg(svg, "in");
    static const char* const box = "viewBox=\"0 0 ";
    const std::size_t at = inner.find(box);
    double width = 1, height = 1;
    if (at == std::string::npos ||
        std::sscanf(inner.c_str() + at, "viewBox=\"0 0 %lf %lf\"", &width, &height) != 2)
        return svg;
    const double scale = std::min(slide_width / width, slide_height / height);
    const std::size_t end = inner.find('>');
    Svg slide(slide_width, slide_height, "slide");
    slide.raw(fmt::format("<svg x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" viewBox=\"0 0 {} {}\" "
                          "font-family=\"DejaVu Sans, Verdana, sans-serif\">",
                          px(0.5 * (slide_width - scale * width)),
                          px(0.5 * (slide_height - scale * height)), px(scale * width),
                          px(scale * height), px(width), px(height)) +
              inner.substr(end + 1));
    return slide.finish();
}

void write_run_report(OutputFolder& folder, const Case& c, bool figures) {
    const RunReport report = run_report(c, read_run_folder(folder.path(), c));
    folder.write(output_names::report, page_html(report.page));
    if (!figures) return;
    for (const Figure& figure : report.figures) {
        const std::string path = std::string(output_names::figures) + "/" + figure.id;
        folder.write(path + ".svg", figure.svg);
        folder.write(path + ".png",
                     png_of(slide_of(figure.slide.empty() ? figure.svg : figure.slide), 1));
    }
}

} // namespace rille::engine
