// SPDX-License-Identifier: Apache-2.0
// Internal to the run's report: its parts.
#pragma once

#include "engine/case.hpp"
#include "engine/report/page.hpp"
#include "engine/report/run_folder.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// What all parts of a run's report share. Figures that a part shows are put into `figures`.
struct RunParts {
    const Case& c;
    const RunFolder& folder;
    std::vector<Figure>& figures;

    /// Shows a figure and keeps it.
    std::string show(const Figure& figure) const {
        figures.push_back(figure);
        return figure_html(figure);
    }
};

/// Facts beside the picture on the first screen.
std::string outcome_html(const RunParts&);
std::string asked_html(const RunParts&);
std::string results_html(const RunParts&);
std::string targets_html(const RunParts&);
std::string standing_html(const RunParts&);
/// Sections; empty `html` where there is nothing to show.
PageSection arrivals_section(const RunParts&);
PageSection curves_section(const RunParts&);
PageSection measured_section(const RunParts&);
/// The final front beside what the case names as measured.
PageSection comparison_section(const RunParts&, const Comparison&);
PageSection cost_section(const RunParts&);
PageSection case_section(const RunParts&);
PageSection origin_section(const RunParts&);
PageSection warnings_section(const RunParts&);
/// The final surface to be turned about; `full` only. Adds its mesh and script to the page.
PageSection surface_section(const RunParts&, const SurfaceState& last, Page&);

/// Names of the heights at which CDs are read, from the top down.
std::vector<std::string> places_from_the_top(const Case&);
/// "CD" for "cd" wherever it stands as a word of its own: "top CD".
std::string metric_label(const std::string& name);
/// A value with unit as shown: "60.1 nm", "88.5°", "2.7".
std::string unit_text(const std::string& unit);
/// Warnings of the case and of the run, without repetitions.
std::vector<std::string> all_warnings(const RunParts&);

} // namespace rille::engine
