// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/output_folder.hpp"
#include "engine/report/page.hpp"
#include "engine/report/run_folder.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// The report on one run: the page and its figures, which can be written as files as well.
struct RunReport {
    Page page;
    std::vector<Figure> figures;
};

/// The report on what lies in a run's folder, whole or not. Reads its frames. Throws OutputError.
RunReport run_report(const Case&, const RunFolder&);

/// Writes report.html into the folder of a run, with `figures` also figures/ID.svg and ID.png
/// (1920 x 1080 px). Throws OutputError.
void write_run_report(OutputFolder&, const Case&, bool figures = false);

/// A drawing set into the middle of a slide of 1920 x 1080 px.
std::string slide_of(const std::string& svg);

} // namespace rille::engine
