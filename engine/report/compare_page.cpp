// SPDX-License-Identifier: Apache-2.0
#include "engine/report/compare_page.hpp"

#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/output_names.hpp"
#include "engine/picture.hpp"
#include "engine/problems.hpp"
#include "engine/report/case_difference.hpp"
#include "engine/report/run_folder.hpp"
#include "engine/report/study_figures.hpp"
#include "engine/report/study_profiles.hpp"
#include "engine/study/study.hpp"
#include "engine/study/study_names.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fmt/format.h>
#include <set>

namespace rille::engine {
namespace {

using nlohmann::json;
namespace fs = std::filesystem;

struct ComparedRun {
    std::string name, link, title, status;
    Metrics metrics;
    Section outline;
    std::map<std::string, std::string> values; ///< of its case
};

std::string text_if_there(const fs::path& path) {
    std::error_code ignored;
    return fs::exists(path, ignored) ? read_file(path.string()) : "";
}

std::string member(const json& object, const char* key) {
    const auto found = object.is_object() ? object.find(key) : object.end();
    return object.is_object() && found != object.end() && found->is_string()
               ? found->get<std::string>()
               : "";
}

/// Values of the case of a point, which as a rule keeps no case.yaml of its own, from the study
/// that it lies in. Empty where that is not there, or is not the one that made the point.
std::map<std::string, std::string> point_values(const fs::path& folder, const json& record) {
    const fs::path study_file =
        fs::absolute(folder / "").lexically_normal().parent_path().parent_path().parent_path() /
        study_names::study;
    std::error_code ignored;
    if (!fs::exists(study_file, ignored)) return {};
    try {
        const Study study = reload_study(study_file.string());
        const std::size_t index = record.at("point");
        if (index >= study.points) return {};
        std::vector<std::string> texts;
        for (const StudyValue& value : study_point(study, index).values)
            texts.push_back(value.text);
        if (record.at("values") != json(texts)) return {};
        return case_values(point_case(study, index));
    } catch (const InputError&) {
    } catch (const json::exception&) {
    }
    return {};
}

ComparedRun read_run(const std::string& folder) {
    constexpr const char* tried = "cannot compare this run";
    ComparedRun run;
    const fs::path path(folder);
    const std::string metrics = text_if_there(path / output_names::metrics);
    const std::string profile = text_if_there(path / output_names::profile);
    if (metrics.empty() && profile.empty())
        throw OutputError(folder, tried,
                          std::string("it holds neither ") + output_names::metrics + " nor " +
                              output_names::profile);
    try {
        if (!metrics.empty()) {
            const json parsed = json::parse(metrics);
            run.metrics = metrics_from_json(parsed);
            run.title = member(parsed, "title");
        }
    } catch (const json::exception&) {
        throw OutputError((path / output_names::metrics).string(), tried, "the file is damaged");
    }
    run.outline = profile_outline(profile, 0.05);
    const json point = json::parse(text_if_there(path / study_names::point_record), nullptr, false);
    run.status =
        member(json::parse(text_if_there(path / output_names::record), nullptr, false), "status");
    if (run.status.empty()) run.status = member(point, "status");
    run.values = case_values(text_if_there(path / output_names::resolved_case));
    if (run.values.empty() && point.is_object()) run.values = point_values(path, point);
    return run;
}

/// Folder names, with as many parents as they need to stay apart.
std::vector<std::string> short_names(const std::vector<std::string>& folders) {
    std::vector<std::vector<std::string>> parts;
    std::size_t deepest = 1;
    for (const std::string& folder : folders) {
        parts.emplace_back();
        for (const fs::path& part : fs::absolute(folder).lexically_normal())
            if (!part.empty() && part != "/") parts.back().push_back(part.string());
        deepest = std::max(deepest, parts.back().size());
    }
    std::vector<std::string> names;
    for (std::size_t taken = 1; taken <= deepest; ++taken) {
        names.clear();
        for (const auto& part : parts) {
            std::string name;
            for (std::size_t i = part.size() - std::min(taken, part.size()); i < part.size(); ++i)
                name += (name.empty() ? "" : "/") + part[i];
            names.push_back(name);
        }
        if (std::set<std::string>(names.begin(), names.end()).size() == names.size()) break;
    }
    return names;
}

std::string full_name(const Metric& metric, bool several) {
    return metric_title(metric.name) +
           (several && !metric.feature.empty() ? " of " + metric.feature : "");
}

/// Value with error, or why there is none.
DataTable::Cell value_cell(const Metric* metric) {
    if (!metric) return {"none"};
    if (!metric->value) return {metric->note.empty() ? "none" : metric->note};
    return {with_error(*metric->value, metric->sampling_error) + unit_suffix(metric->unit),
            shortest(*metric->value)};
}

DataTable::Cell difference_cell(const Metric* first, const Metric* other) {
    if (!first || !other || !first->value || !other->value) return {""};
    if (first->definition != other->definition || first->unit != other->unit)
        return {"defined otherwise"};
    const double difference = *other->value - *first->value;
    const double error = std::hypot(first->sampling_error, other->sampling_error);
    const std::string text =
        (difference > 0 ? "+" : "") + with_error(difference, error) + unit_suffix(first->unit);
    DataTable::Cell cell{text, shortest(difference)};
    if (std::fabs(difference) > error) cell.html = "<strong>" + escaped(text) + "</strong>";
    return cell;
}

std::string differences_html(const std::vector<ComparedRun>& runs) {
    std::vector<std::pair<std::string, std::string>> names; // metric and feature, in order
    std::set<std::string> features;
    for (const ComparedRun& run : runs)
        for (const Metric& metric : run.metrics.metrics) {
            const std::pair<std::string, std::string> name{metric.name, metric.feature};
            features.insert(metric.feature);
            if (std::find(names.begin(), names.end(), name) == names.end()) names.push_back(name);
        }
    DataTable table;
    table.id = "differences-table";
    table.columns = {{"quantity", false, "", true}, {runs[0].name, true}};
    for (std::size_t r = 1; r < runs.size(); ++r) {
        table.columns.push_back({runs[r].name, true});
        table.columns.push_back({runs[r].name + " − " + runs[0].name, true, "difference"});
    }
    for (const auto& [name, feature] : names) {
        const auto in = [&, &n = name, &f = feature](const ComparedRun& run) -> const Metric* {
            for (const Metric& metric : run.metrics.metrics)
                if (metric.name == n && metric.feature == f) return &metric;
            return nullptr;
        };
        const Metric* first = in(runs[0]);
        std::vector<DataTable::Cell> row{
            {full_name(Metric{name, feature, {}, "", 0, "", ""}, features.size() > 1)},
            value_cell(first)};
        for (std::size_t r = 1; r < runs.size(); ++r) {
            row.push_back(value_cell(in(runs[r])));
            row.push_back(difference_cell(first, in(runs[r])));
        }
        table.rows.push_back(row);
    }
    return table_html(table) +
           "<p>± 95 % sampling errors; that of a difference is the root of the sum of squares of "
           "both. Grid error is not in it. Bold: the difference goes beyond its error.</p>\n";
}

/// Status, films and targets of every run.
std::string verdicts_html(const std::vector<ComparedRun>& runs) {
    DataTable table;
    table.id = "verdicts-table";
    table.columns = {{"", false, "", true}};
    for (const ComparedRun& run : runs)
        table.columns.push_back({run.name});
    std::vector<std::string> rows{"status", "time simulated"};
    std::vector<std::map<std::string, std::string>> said(runs.size());
    for (std::size_t r = 0; r < runs.size(); ++r) {
        const Metrics& m = runs[r].metrics;
        said[r]["status"] = runs[r].status;
        if (m.time_s > 0) said[r]["time simulated"] = fmt::format("{:.4g} s", m.time_s);
        const auto add = [&](const std::string& row, const std::string& text) {
            if (std::find(rows.begin(), rows.end(), row) == rows.end()) rows.push_back(row);
            said[r][row] = text;
        };
        for (const Metrics::Clearing& film : m.clearing)
            add(film.film + " in " + film.feature,
                film.cleared ? "cleared" : rounded(film.remaining_nm) + " nm left");
        for (const TargetVerdict& target : m.targets)
            add("target " + target.target + (target.feature.empty() ? "" : " of " + target.feature),
                verdict_name(target.verdict));
    }
    for (const std::string& row : rows) {
        std::vector<DataTable::Cell> cells{{row}};
        for (const auto& words : said) {
            const auto found = words.find(row);
            cells.push_back({found == words.end() ? "" : found->second});
        }
        table.rows.push_back(cells);
    }
    return table_html(table);
}

std::string inputs_html(const std::vector<ComparedRun>& runs) {
    std::vector<std::map<std::string, std::string>> cases;
    for (const ComparedRun& run : runs) {
        if (run.values.empty())
            return "<p>A run keeps no case.yaml and lies in no study, so what they differ in is "
                   "not "
                   "known here.</p>\n";
        cases.push_back(run.values);
    }
    const std::vector<CaseDifference> differences = case_differences(cases);
    if (differences.empty()) return "<p>The cases are the same.</p>\n";
    DataTable table;
    table.id = "inputs-table";
    table.columns = {{"input", false, "", true}};
    for (const ComparedRun& run : runs)
        table.columns.push_back({run.name});
    for (const CaseDifference& difference : differences) {
        std::vector<DataTable::Cell> row{{difference.path}};
        for (const std::string& value : difference.values)
            row.push_back({value.empty() ? "none" : value});
        table.rows.push_back(row);
    }
    return table_html(table);
}

ProfileOverlay overlay_of(const std::vector<ComparedRun>& runs) {
    ProfileOverlay overlay;
    overlay.text.id = "profiles";
    overlay.text.title = "Final profiles side by side";
    for (const ComparedRun& run : runs) {
        ProfileOutline outline;
        outline.name = run.name;
        outline.lines = run.outline;
        if (run.outline.empty()) outline.note = "no profile kept";
        overlay.outlines.push_back(outline);
    }
    return overlay;
}

std::string names_html(const std::vector<ComparedRun>& runs) {
    std::string html = "<ol>";
    for (const ComparedRun& run : runs) {
        html += "<li>" + (run.link.empty() ? escaped(run.name)
                                           : "<a href=\"" + escaped(run.link) + "/\">" +
                                                 escaped(run.name) + "</a>");
        html += (run.title.empty() ? "" : ": " + escaped(run.title)) + "</li>";
    }
    return html + "</ol>\n";
}

} // namespace

CompareReport compare_report(const std::vector<std::string>& folders,
                             const std::vector<std::string>& links) {
    std::vector<ComparedRun> runs;
    const std::vector<std::string> names = short_names(folders);
    for (std::size_t i = 0; i < folders.size(); ++i) {
        runs.push_back(read_run(folders[i]));
        runs.back().name = names[i];
        if (i < links.size()) runs.back().link = links[i];
    }
    CompareReport report;
    Page& page = report.page;
    page.kind = "Side by side";
    page.title = std::to_string(runs.size()) + " runs side by side";
    page.subtitle = "held against the first: " + runs[0].name;
    page.styles = {"study.css"};
    const bool any = std::any_of(runs.begin(), runs.end(),
                                 [](const ComparedRun& run) { return !run.outline.empty(); });
    if (any)
        report.figures.push_back(figure_of(overlay_of(runs), "The last profiles, to one scale."));
    page.summary = "<div class=\"answer\">\n<div>\n" +
                   (any ? figure_html(report.figures[0])
                        : "<p class=\"outcome\">No run keeps a profile.</p>\n") +
                   "</div>\n<div>\n<h2>Runs</h2>\n" + names_html(runs) + verdicts_html(runs) +
                   "<p class=\"caution\">" + escaped(caution) + "</p>\n</div>\n</div>\n";
    page.sections = {{"differences", "Differences", differences_html(runs), false},
                     {"inputs", "What differs in the cases", inputs_html(runs), false}};
    return report;
}

void write_comparison(OutputFolder& folder, const std::vector<std::string>& folders, bool figures) {
    std::vector<std::string> links;
    for (const std::string& one : folders)
        links.push_back(
            fs::relative(fs::absolute(one), fs::absolute(folder.path())).generic_string());
    const CompareReport report = compare_report(folders, links);
    folder.write(output_names::report, page_html(report.page));
    if (!figures) return;
    for (const Figure& figure : report.figures) {
        const std::string path = std::string(output_names::figures) + "/" + figure.id;
        folder.write(path + ".svg", figure.svg);
        folder.write(path + ".png", png_of(figure.slide, 1));
    }
}

} // namespace rille::engine
