// SPDX-License-Identifier: Apache-2.0
#include "engine/study_ending.hpp"

#include "engine/caution.hpp"
#include "engine/output_folder.hpp"
#include "engine/report/study_page.hpp"
#include "engine/study/results.hpp"
#include "engine/study/study_effects.hpp"
#include "engine/study/study_measured.hpp"
#include "engine/study/study_names.hpp"

#include <filesystem>
#include <fmt/format.h>
#include <iostream>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

std::string closing(const Study& study, const StudyResults& results, const std::string& folder,
                    bool stopped) {
    const StudyCounts& n = results.counts;
    std::string text = fmt::format("{}: {} of {} points\n", study.title, n.finished(), n.points);
    for (const auto& [count, word] : {std::pair(n.done, study_names::done),
                                      {n.not_cleared, study_names::not_cleared},
                                      {n.clogged, study_names::clogged},
                                      {n.failed, study_names::failed},
                                      {n.killed, study_names::killed},
                                      {n.missing(), study_names::missing}})
        if (count) text += fmt::format("  {:6} {}\n", count, word);
    for (const StudyFailure& failure : results.failures)
        text += fmt::format("  point {} {}: {}\n", failure.point, failure.status, failure.failure);
    const std::size_t told = results.failures.size();
    if (n.failed + n.killed > told)
        text += fmt::format("  and {} more; column failure of {}\n", n.failed + n.killed - told,
                            study_names::results);
    for (const std::string& warning : results.warnings)
        text += "warning: " + warning + "\n";
    if (stopped || n.missing())
        text += "the same command goes on with what is missing\n";
    else if (n.failed + n.killed)
        text += "the same command with --retry failed or --retry killed does those points again\n";
    for (const char* name : {study_names::report, study_names::results}) {
        std::error_code ignored;
        const fs::path path = fs::path(folder) / name;
        if (fs::exists(path, ignored))
            text += fmt::format("{}: {}\n", name == study_names::report ? "report" : "table",
                                path.string());
    }
    return text + caution + "\n";
}

nlohmann::json counts_json(const Study& study, const StudyResults& results) {
    const StudyCounts& n = results.counts;
    nlohmann::json failures = nlohmann::json::array();
    for (const StudyFailure& f : results.failures)
        failures.push_back({{"point", f.point}, {"status", f.status}, {"failure", f.failure}});
    return {{"title", study.title},         {"points", n.points},     {"done", n.done},
            {"not_cleared", n.not_cleared}, {"clogged", n.clogged},   {"failed", n.failed},
            {"killed", n.killed},           {"missing", n.missing()}, {"failures", failures},
            {"warnings", results.warnings}};
}

bool all_targets_met(const std::string& folder) {
    const StudyTable table = read_study_table(folder);
    for (const std::size_t column : table.all(StudyTableColumn::Role::target))
        for (std::size_t row = 0; row < table.rows(); ++row)
            if (table.text(row, column) != "met") return false;
    return true;
}

} // namespace

void write_study_pages(const std::string& folder, const Study& study) {
    write_study_effects(folder, study);
    write_measured(folder, study);
    OutputFolder out(folder, OutputFolder::Existing::keep);
    write_study_report(out);
}

int conclude_study(const std::string& folder, const Study& study, const CommonOptions& options,
                   bool stopped) {
    const StudyResults results = write_study_results(folder, study);
    write_study_pages(folder, study);
    if (options.json)
        std::cout << counts_json(study, results).dump(2) << '\n';
    else if (!options.quiet)
        std::cout << closing(study, results, folder, stopped);
    if (stopped) return interrupted_status;
    const StudyCounts& n = results.counts;
    if (n.failed + n.killed + n.missing()) return incomplete_status;
    return options.require_targets && !all_targets_met(folder) ? goal_not_met_status : 0;
}

} // namespace rille::engine
