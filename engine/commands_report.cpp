// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/commands.hpp"
#include "engine/output_names.hpp"
#include "engine/problems.hpp"
#include "engine/report/run_page.hpp"

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

} // namespace

int report_command(const std::vector<std::string>& folders, bool figures,
                   const CommonOptions& options) {
    for (const std::string& folder : folders)
        report_run(folder, figures, options);
    return 0;
}

} // namespace rille::engine
