// SPDX-License-Identifier: Apache-2.0
// Folders of studies as a study leaves them, with made-up results.
#pragma once

#include "engine/number_text.hpp"
#include "engine/study/results_columns.hpp"
#include "engine/study/study_names.hpp"

#include <cmath>
#include <filesystem>
#include <fmt/format.h>
#include <fstream>
#include <functional>
#include <nlohmann/json.hpp>
#include <string>
#include <unistd.h>
#include <vector>

namespace rille::tests {

/// A folder of its own that goes away with the object.
struct TemporaryFolder {
    std::string path;
    TemporaryFolder() {
        static int count = 0;
        path = (std::filesystem::temp_directory_path() /
                fmt::format("rille_report_{}_{}", ::getpid(), count++))
                   .string();
        std::filesystem::create_directories(path);
    }
    ~TemporaryFolder() { std::filesystem::remove_all(path); }
    TemporaryFolder(const TemporaryFolder&) = delete;
    TemporaryFolder& operator=(const TemporaryFolder&) = delete;
};

/// CD loss = 0.5 + 0.006 amplitude + 0.02 (cd - 30) of a grid of amplitudes and openings.
struct StudySample {
    std::vector<double> amplitudes{100, 200, 300, 400, 500, 600, 700, 800};
    std::vector<double> openings{30, 40, 60, 90, 200};
    int more_metrics = 2; ///< besides the CD loss
    bool has_targets = true, has_profiles = true, asks = true;
    /// Status of point i; "" = not run.
    std::function<std::string(std::size_t)> status = [](std::size_t) { return "done"; };

    bool is_grid = true; ///< false: point i has amplitudes[i] and openings[i]

    std::size_t points() const { return amplitudes.size() * (is_grid ? openings.size() : 1); }
    double amplitude(std::size_t i) const { return amplitudes[i % amplitudes.size()]; }
    double opening(std::size_t i) const { return openings[is_grid ? i / amplitudes.size() : i]; }
    double loss(std::size_t i) const {
        return 0.5 + 0.006 * amplitude(i) + 0.02 * (opening(i) - 30) + 1e-7 * double(i);
    }
    static double error(std::size_t i) { return 0.1 + 0.01 * double(i % 5); }
    static std::string name(std::size_t i) { return fmt::format("{:04d}", i + 1); }
};

inline engine::Study study_of(const StudySample& sample) {
    engine::Study study;
    study.title = "CD loss against rf bias <five openings>";
    study.columns = {{"plasmas.main.rf_bias.amplitude", "amplitude", "V", false, "", false},
                     {"mask.openings.line.cd", "cd", "nm", false, "", false},
                     {"plasmas.main.ion_flux", "ion_flux", "mA/cm2", true, "", false}};
    study.points = sample.points();
    study.plan = sample.is_grid ? "full grid" : "latin hypercube";
    study.constants = {"pressure of main stays 10 mTorr while rf_bias.amplitude changes",
                       "pitch stays 400 nm while cd changes"};
    return study;
}

inline std::string profile_sample(double width, double depth) {
    std::string csv = "x_nm,z_nm,arc_length_nm,normal_deg,length_nm,chain,material,film\n";
    const double half = 0.5 * width;
    const auto add = [&](double x, double z) {
        csv += fmt::format("{},{},0,0,2,0,Si,gate\n", x, z);
    };
    for (double x = -119; x < -half; x += 2)
        add(x, 40);
    for (double z = 39; z > -depth; z -= 2)
        add(-half, z);
    for (double x = -half + 1; x < half; x += 2)
        add(x, -depth);
    for (double z = -depth + 1; z < 40; z += 2)
        add(half, z);
    for (double x = half + 1; x < 120; x += 2)
        add(x, 40);
    return csv;
}

inline std::string results_row(const StudySample& s, std::size_t i, const std::string& status) {
    const bool has_values = status == "done" || status == "not cleared" || status == "clogged";
    std::string row =
        fmt::format("{},{},{},{},{}", s.name(i), status, engine::shortest(s.amplitude(i)),
                    engine::shortest(s.opening(i)), engine::shortest(1 + s.amplitude(i) / 1000));
    const auto pair = [&](double value, double error) {
        row += has_values ? "," + engine::shortest(value) + "," + engine::shortest(error) : ",,";
    };
    pair(s.loss(i), s.error(i));
    for (int m = 0; m < s.more_metrics; ++m)
        pair(s.opening(i) / 3 + m, 0.07 + m);
    row += has_values ? ",not assessed" : ",";
    if (s.has_targets)
        row += !has_values       ? ",,"
               : s.loss(i) < 2.5 ? ",met,undecided"
               : s.loss(i) > 4   ? ",missed,met"
                                 : ",undecided,met";
    row += ",0,14,3,2,0,";
    row += engine::csv_field(has_values ? ""
                                        : "the step from 1.2 s on gives a \"rate\" that is not "
                                          "finite, at opening 2");
    return row + fmt::format(",{:.1f}\n", 12.5 + double(i % 7));
}

/// Writes study.json, results.csv and points/ into the folder.
inline void write_study(const std::string& folder, const StudySample& sample) {
    namespace fs = std::filesystem;
    using namespace rille::engine;
    const Study study = study_of(sample);
    std::vector<StudyTableColumn> metrics, targets;
    const auto add_metric = [&](const std::string& name) {
        metrics.push_back(metric_column(name, "line", "nm", false, "definition of " + name));
        metrics.push_back(error_column(metrics.back(), false));
    };
    add_metric("bottom cd_loss");
    for (int m = 0; m < sample.more_metrics; ++m)
        add_metric("metric " + std::to_string(m));
    if (sample.has_targets)
        targets = {target_column("bottom cd_loss", "line", false),
                   target_column("metric 0", "line", false)};
    std::ofstream results(folder + "/" + study_names::results);
    results << header_text(study, all_columns(study, metrics, targets), {});
    for (std::size_t i = 0; i < sample.points(); ++i) {
        const std::string status = sample.status(i);
        if (status.empty()) continue;
        results << results_row(sample, i, status);
        if (!sample.has_profiles || status == "failed" || status == "killed") continue;
        const std::string point = folder + "/points/" + sample.name(i);
        fs::create_directories(point);
        std::ofstream(point + "/profile.csv")
            << profile_sample(sample.opening(i) + sample.loss(i), 150 + sample.amplitude(i) / 10);
    }
    nlohmann::json manifest = {{"format", 1},
                               {"title", study.title},
                               {"plan", study.plan},
                               {"points", study.points},
                               {"constants", study.constants},
                               {"warnings", nlohmann::json::array()},
                               {"comparison", nullptr},
                               {"answer", nullptr}};
    if (sample.asks)
        manifest["answer"] = {
            {"y", "bottom cd_loss"}, {"feature", "line"}, {"x", 0}, {"line_per", 1}};
    std::ofstream(folder + "/" + study_names::manifest) << manifest.dump(1);
}

} // namespace rille::tests
