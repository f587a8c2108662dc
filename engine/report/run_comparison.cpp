// SPDX-License-Identifier: Apache-2.0
// The part of a run's report that stands beside measurements.
#include "engine/comparison.hpp"
#include "engine/number_text.hpp"
#include "engine/report/chart.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/svg.hpp"

#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

DataTable::Cell cell(double value, double error = 0) {
    return {with_error(value, error), shortest(value)};
}

std::string contours_table(const Comparison& comparison) {
    DataTable table;
    table.id = "contours";
    table.columns = {{"opening", false, "", true},
                     {"section at (nm from the axis)", true},
                     {"RMS distance (nm)", true},
                     {"largest (nm)", true},
                     {"largest at z (nm)", true}};
    for (const ContourComparison& contour : comparison.contours)
        table.rows.push_back({{contour.feature},
                              cell(contour.cut_nm),
                              cell(contour.rms_nm, contour.rms_error_nm),
                              cell(contour.largest_nm),
                              cell(contour.largest_at_z_nm)});
    return table.rows.empty() ? "" : table_html(table);
}

std::string cds_table(const Comparison& comparison) {
    DataTable table;
    table.id = "measured-cds";
    table.columns = {{"CD", false, "", true},  {"opening"},
                     {"measured (nm)", true},  {"sites", true},
                     {"predicted (nm)", true}, {"predicted less measured (nm)", true}};
    for (const CdComparison& cd : comparison.cds) {
        std::vector<DataTable::Cell> row = {{cd.place},
                                            {cd.feature},
                                            cell(cd.mean_nm, cd.mean_error_nm),
                                            {std::to_string(cd.sites)}};
        if (cd.predicted_nm) {
            row.push_back(cell(*cd.predicted_nm, cd.predicted_error_nm));
            row.push_back(cell(*cd.predicted_nm - cd.mean_nm,
                               std::hypot(cd.predicted_error_nm, cd.mean_error_nm)));
        } else {
            row.insert(row.end(), {{"none"}, {""}});
        }
        table.rows.push_back(row);
    }
    return table.rows.empty() ? "" : table_html(table);
}

/// Difference of the widths at each height.
std::string widths_figure(const RunParts& p, const Comparison& comparison) {
    LineChart chart;
    chart.text.id = "width-difference";
    chart.text.title = "Width: predicted less measured";
    chart.text.subtitle = p.c.title;
    chart.x = {"height above the mask bottom", "nm", false, {}, {}, false, {}};
    chart.y = {"difference of the full width", "nm", false, {}, {}, true, {}};
    for (const ContourComparison& contour : comparison.contours) {
        ChartLine line;
        line.name = comparison.contours.size() > 1
                        ? fmt::format("section {:.4g} nm from the axis", contour.cut_nm)
                        : "";
        line.has_markers = false;
        for (const WallsAt& walls : contour.walls) {
            if (!walls.measured || !walls.predicted) continue;
            ChartPoint point;
            point.x = walls.z_nm;
            point.y = (walls.predicted->right_nm - walls.predicted->left_nm) -
                      (walls.measured->right_nm - walls.measured->left_nm);
            line.points.push_back(point);
        }
        if (line.points.size() > 1) chart.lines.push_back(line);
    }
    if (chart.lines.empty()) return "";
    Figure figure;
    figure.id = chart.text.id;
    figure.svg = chart_svg(chart, FigureForm::page);
    figure.narrow = chart_svg(chart, FigureForm::narrow);
    figure.slide = chart_svg(chart, FigureForm::slide);
    figure.caption = "Walls of the measured contour against those of the final front, height by "
                     "height; comparison.csv has both.";
    return p.show(figure);
}

} // namespace

PageSection comparison_section(const RunParts& p, const Comparison& comparison) {
    PageSection section{"comparison", "Beside the measurement", "", false, "Measurement"};
    section.html =
        contours_table(comparison) + cds_table(comparison) + widths_figure(p, comparison);
    if (section.html.empty()) return section;
    if (p.c.measured.contour)
        section.html =
            "<p>Contour from " + escaped(p.c.measured.contour->source) +
            "; it is drawn into the profile above. ± of a measured CD is 1.96 sigma over "
            "the root of its sites, of a prediction its sampling error.</p>\n" +
            section.html;
    return section;
}

} // namespace rille::engine
