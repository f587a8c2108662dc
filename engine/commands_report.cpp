// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/commands.hpp"
#include "engine/output_names.hpp"
#include "engine/problems.hpp"
#include "engine/report/compare_page.hpp"
#include "engine/report/run_page.hpp"
#include "engine/report/study_page.hpp"
#include "engine/study/study_names.hpp"

#include <filesystem>
#include <iostream>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

void report_run(const std::string& path, bool figures, const CommonOptions& options) {
    OutputFolder folder(path, OutputFolder::Existing::keep);
    const fs::path file = fs::path(path) / output_names::resolved_case;
    if (!fs::exists(file))
        throw OutputError(path, "looking for a run to report on",
                          std::string("there is no ") + output_names::resolved_case + " here");
    write_run_report(folder, load_case(file.string(), {}), figures);
    if (!options.quiet) std::cout << (fs::path(path) / output_names::report).string() << '\n';
}

bool is_study(const std::string& path) {
    std::error_code ignored;
    return fs::exists(fs::path(path) / study_names::manifest, ignored);
}

void report_study(const std::string& path, bool figures, const CommonOptions& options) {
    OutputFolder folder(path, OutputFolder::Existing::keep);
    write_study_report(folder, figures);
    if (!options.quiet) std::cout << (fs::path(path) / study_names::report).string() << '\n';
}

void report_side_by_side(const std::vector<std::string>& paths, const std::string& place,
                         bool figures, const CommonOptions& options) {
    for (const std::string& path : paths)
        if (is_study(path))
            throw OutputError(path, "cannot compare this folder",
                              "it holds a study; its points can be compared: " +
                                  (fs::path(path) / study_names::points / "0001").string());
    // Only an earlier comparison, which is nothing but a page, is replaced.
    std::error_code ignored;
    const bool is_earlier = fs::exists(fs::path(place) / output_names::report, ignored) &&
                            !fs::exists(fs::path(place) / output_names::resolved_case, ignored) &&
                            !is_study(place);
    OutputFolder folder(place,
                        is_earlier ? OutputFolder::Existing::keep : OutputFolder::Existing::refuse);
    write_comparison(folder, paths, figures);
    if (!options.quiet) std::cout << (fs::path(place) / output_names::report).string() << '\n';
}

} // namespace

int report_command(const std::vector<std::string>& folders, const std::string& place, bool figures,
                   const CommonOptions& options) {
    if (folders.size() > 1)
        report_side_by_side(folders, place, figures, options);
    else if (is_study(folders.at(0)))
        report_study(folders[0], figures, options);
    else
        report_run(folders[0], figures, options);
    return 0;
}

} // namespace rille::engine
