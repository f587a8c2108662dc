// SPDX-License-Identifier: Apache-2.0
// Internal to the report on a study: its parts.
#pragma once

#include "engine/report/page.hpp"
#include "engine/report/study_figures.hpp"
#include "engine/report/study_profiles.hpp"

namespace rille::engine {

/// What all parts share. Figures that a part shows are kept.
struct StudyParts {
    const StudyView& view;
    ProfileShelf& shelf;
    std::vector<Figure>& figures;

    template <class Chart>
    SliceFigure show(const std::string& name, const Chart& chart,
                     const std::string& caption) const {
        figures.push_back(figure_of(chart, caption));
        return {name, figures.back()};
    }
    template <class Chart>
    const Figure& show_small(const Chart& chart, const std::string& caption) const {
        figures.push_back(small_figure_of(chart, caption));
        return figures.back();
    }
};

/// The first screen: the curve, what it says, how the points ended.
std::string study_summary_html(const StudyParts&);
/// Sections; empty `html` where there is nothing to show.
PageSection scatter_section(const StudyParts&);
PageSection profiles_section(const StudyParts&);
PageSection maps_section(const StudyParts&);
PageSection window_section(const StudyParts&);
PageSection effects_section(const StudyParts&);
PageSection points_section(const StudyParts&, Page&);
PageSection failures_section(const StudyParts&);
PageSection about_section(const StudyParts&);

/// "What stays constant" as a list, for repeating it; empty if there is nothing.
std::string constants_html(const StudyView&);
/// The table of all points for the page's scripts.
std::string points_json(const StudyView&);

} // namespace rille::engine
