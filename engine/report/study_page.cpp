// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_page.hpp"

#include "engine/output_names.hpp"
#include "engine/picture.hpp"
#include "engine/report/study_parts.hpp"
#include "engine/study/study_names.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <filesystem>
#include <fmt/format.h>

namespace rille::engine {
namespace {

using Role = StudyTableColumn::Role;
namespace fs = std::filesystem;

constexpr std::size_t most_map_metrics = 4;

std::string subtitle(const StudyView& view) {
    std::string text =
        fmt::format("{} of {} points finished", view.counts.finished(), view.counts.points);
    std::string inputs;
    for (const StudyAxis& axis : view.axes)
        if (!axis.is_linked)
            inputs += (inputs.empty() ? "" : ", ") +
                      fmt::format("{} ({} value{})", axis.title, axis.labels.size(),
                                  axis.labels.size() == 1 ? "" : "s");
    return inputs.empty() ? text : text + " · varied: " + inputs;
}

PageSection study_file_section(const std::string& folder) {
    PageSection section{"asked", "The study as understood", "", true};
    const fs::path path = fs::path(folder) / study_names::study;
    std::error_code ignored;
    if (fs::exists(path, ignored))
        section.html =
            "<pre tabindex=\"0\">" + escaped_lines(read_file(path.string())) + "</pre>\n";
    return section;
}

void write_figure(OutputFolder& folder, const std::string& name, const Figure& figure) {
    folder.write(name + ".svg", figure.svg);
    folder.write(name + ".png", png_of(figure.slide, 1));
}

} // namespace

PageSection profiles_section(const StudyParts& p) {
    PageSection section{"final-profiles", "Final profiles", "", false};
    std::vector<SliceFigure> figures;
    for (const auto& [name, row] : profile_rows(p.view, p.shelf))
        figures.push_back(p.show(name, row, "All to one scale."));
    if (!figures.empty()) section.html = slices_html("profiles-choice", "Shown for", figures);
    return section;
}

PageSection maps_section(const StudyParts& p) {
    PageSection section{"maps", "Over two axes", "", false};
    for (const std::size_t metric : asked_metrics(p.view, most_map_metrics)) {
        std::vector<SliceFigure> figures;
        for (const auto& [name, map] : metric_maps(p.view, metric))
            figures.push_back(p.show(name, map, "A cell shows its point's profile."));
        if (!figures.empty())
            section.html +=
                slices_html("map-choice-" + std::to_string(metric), "Shown for", figures);
    }
    return section;
}

PageSection window_section(const StudyParts& p) {
    PageSection section{"process-window", "Process window", "", false};
    const std::vector<std::size_t> targets = p.view.table.all(Role::target);
    if (targets.empty()) return section;
    std::vector<std::optional<std::size_t>> asked{std::nullopt};
    if (targets.size() > 1) asked.insert(asked.end(), targets.begin(), targets.end());
    std::vector<SliceFigure> figures;
    for (const auto& target : asked)
        for (const auto& [name, map] : window_maps(p.view, target))
            figures.push_back(
                p.show(map.text.title, map, "Verdicts on the targets, point by point."));
    if (figures.empty()) return section;
    section.html = slices_html("window-choice", "Shown for", figures);
    return section;
}

StudyReport study_report(const std::string& folder) {
    const StudyView view = read_study_view(folder);
    ProfileShelf shelf(view);
    StudyReport report;
    Page& page = report.page;
    page.kind = "Study";
    page.title = view.title;
    page.subtitle = subtitle(view);
    page.styles = {"study.css"};
    page.scripts = {"points.js", "study.js"};
    const StudyParts parts{view, shelf, report.figures};
    page.summary = study_summary_html(parts);
    std::vector<PageSection> sections;
    for (const auto make :
         {scatter_section, profiles_section, maps_section, window_section, effects_section})
        sections.push_back(make(parts));
    sections.push_back(points_section(parts, page));
    sections.push_back(failures_section(parts));
    if (view.table.rows() > 0) sections.push_back(about_section(parts));
    sections.push_back(study_file_section(folder));
    for (PageSection& section : sections)
        if (!section.html.empty()) page.sections.push_back(std::move(section));
    return report;
}

void write_study_report(OutputFolder& folder, bool figures) {
    const StudyReport report = study_report(folder.path());
    for (const Figure& figure : report.figures)
        if (figure.id == "answer") {
            folder.write(study_names::answer_svg, figure.svg);
            folder.write(study_names::answer_png, png_of(figure.slide, 1));
        }
    folder.write(study_names::report, page_html(report.page));
    if (!figures) return;
    for (const Figure& figure : report.figures)
        write_figure(folder, std::string(output_names::figures) + "/" + figure.id, figure);
}

} // namespace rille::engine
