// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/output_folder.hpp"
#include "engine/report/page.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// Several runs side by side: the page and its figures, which can be written as files as well.
struct CompareReport {
    Page page;
    std::vector<Figure> figures;
};

/// The report on the folders of two or more runs (or points of a study), the first of which the
/// others are held against: outlines over each other, every quantity with its difference, whose
/// error is the root of the sum of squares of both 95 % sampling errors (grid error is not in it),
/// verdicts, and in what the cases differ. `links` are the folders as seen from the page; empty: no
/// links. Throws OutputError for a folder that holds neither metrics nor a profile.
CompareReport compare_report(const std::vector<std::string>& folders,
                             const std::vector<std::string>& links = {});

/// Writes report.html, with `figures` also figures/ID.svg and ID.png. Throws OutputError.
void write_comparison(OutputFolder&, const std::vector<std::string>& folders, bool figures = false);

} // namespace rille::engine
