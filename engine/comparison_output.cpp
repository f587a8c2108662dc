// SPDX-License-Identifier: Apache-2.0
#include "engine/case.hpp"
#include "engine/comparison.hpp"
#include "engine/metrics.hpp"
#include "engine/number_text.hpp"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

nlohmann::json number(const std::optional<double>& value) {
    return value ? nlohmann::json(*value) : nlohmann::json(nullptr);
}

} // namespace

std::string contour_metric(double cut_nm, bool several) {
    return several ? "contour rms cut " + shortest(cut_nm) + " nm off axis" : "contour rms";
}

std::vector<Metric> comparison_metrics(const Comparison& comparison) {
    std::vector<Metric> metrics;
    const bool several = comparison.contours.size() > 1;
    for (const ContourComparison& contour : comparison.contours) {
        Metric metric{contour_metric(contour.cut_nm, several),
                      contour.feature,
                      contour.rms_nm,
                      "nm",
                      contour.rms_error_nm,
                      "root mean square distance from the measured contour to the front, over the "
                      "length of the contour; largest " +
                          rounded(contour.largest_nm) +
                          " nm at z = " + rounded(contour.largest_at_z_nm) + " nm",
                      ""};
        metrics.push_back(std::move(metric));
    }
    for (const CdComparison& cd : comparison.cds) {
        Metric metric{cd.place + " cd difference",
                      cd.feature,
                      {},
                      "nm",
                      cd.predicted_error_nm,
                      fmt::format("predicted CD less the measured {} nm (mean of {} sites, 95 %)",
                                  with_error(cd.mean_nm, cd.mean_error_nm), cd.sites),
                      ""};
        if (cd.predicted_nm)
            metric.value = *cd.predicted_nm - cd.mean_nm;
        else
            metric.note = "no wall on both sides at this height";
        metrics.push_back(std::move(metric));
    }
    return metrics;
}

std::string comparison_csv(const Case& c, const Comparison& comparison) {
    std::string text = "# " + c.title +
                       "\n# measured contour against the front at the end; difference = " +
                       "predicted less measured width\n"
                       "feature,cut_nm,z_nm,measured_left_nm,measured_right_nm,predicted_left_nm,"
                       "predicted_right_nm,difference_nm,sampling_error_nm\n";
    for (const ContourComparison& contour : comparison.contours)
        for (const WallsAt& row : contour.walls) {
            text += csv_field(contour.feature) + "," + shortest(contour.cut_nm) + "," +
                    shortest(row.z_nm);
            for (const auto* walls : {&row.measured, &row.predicted})
                text += *walls
                            ? "," + shortest((*walls)->left_nm) + "," + shortest((*walls)->right_nm)
                            : std::string(",,");
            if (row.measured && row.predicted)
                text += "," + shortest(row.predicted->right_nm - row.predicted->left_nm -
                                       row.measured->right_nm + row.measured->left_nm);
            else
                text += ",";
            text += (row.predicted ? "," + shortest(row.width_error_nm) : std::string(",")) + "\n";
        }
    return text;
}

nlohmann::json comparison_json(const Comparison& comparison) {
    nlohmann::json contours = nlohmann::json::array(), cds = nlohmann::json::array();
    for (const ContourComparison& contour : comparison.contours)
        contours.push_back({{"feature", contour.feature},
                            {"cut_nm", contour.cut_nm},
                            {"rms_nm", contour.rms_nm},
                            {"rms_sampling_error_nm", contour.rms_error_nm},
                            {"largest_nm", contour.largest_nm},
                            {"largest_at_z_nm", contour.largest_at_z_nm}});
    for (const CdComparison& cd : comparison.cds)
        cds.push_back({{"feature", cd.feature},
                       {"cd", cd.place},
                       {"z_nm", cd.z_nm},
                       {"measured_nm", cd.mean_nm},
                       {"measured_error_nm", cd.mean_error_nm},
                       {"sites", cd.sites},
                       {"predicted_nm", number(cd.predicted_nm)},
                       {"predicted_sampling_error_nm", cd.predicted_error_nm}});
    return {{"contours", contours}, {"cds", cds}};
}

} // namespace rille::engine
