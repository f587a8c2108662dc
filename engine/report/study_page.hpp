// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/output_folder.hpp"
#include "engine/report/page.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// The report on a study: the page and its figures, which can be written as files as well.
struct StudyReport {
    Page page;
    std::vector<Figure> figures; ///< the first is the curve that is asked for, if there is one
};

/// The report on what lies in the folder of a study, whole or not. Throws OutputError.
StudyReport study_report(const std::string& folder);

/// Writes answer.svg and answer.png (1920 x 1080 px), if the study asks for a curve and has values
/// for it, and report.html; with `figures` also figures/ID.svg and ID.png. Throws OutputError.
void write_study_report(OutputFolder&, bool figures = false);

} // namespace rille::engine
