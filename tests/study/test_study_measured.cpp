// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_effects.hpp"
#include "engine/study/study_measured.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

using namespace rille::engine;
using rille::tests::StudyFolder;

TEST_CASE("measured rows are joined to points by values within a tolerance") {
    const StudyFolder folder;
    folder.write("split.csv", "# invented\namplitude_V, cd [um], cd_mean_nm, sigma, sites\n"
                              "100, 0.03, 29.5, 0.4, 9\n200, 0.0300001, 29.1, 0.5, 9\n"
                              "200, 0.031, 30, 0.5, 9\n250, 0.03, 28.9, 0.4, 9\n");
    const Study study = folder.load(
        "vary:\n  mask.openings.line.cd: [30 nm, 60 nm]\n"
        "  plasmas.main.rf_bias.amplitude: [100 V, 0.2 kV]\nrepeats: 2\n"
        "compare: {measured: split.csv, join: [amplitude, cd], value: cd_mean_nm, sigma: sigma, "
        "sites: sites, tolerance: 0.001 %}\n");
    const MeasuredJoin join = join_measured(study);
    REQUIRE(join.rows.size() == 4); // two rows, each at both repeats
    CHECK(join.rows[0].point == 0);
    CHECK(join.rows[1].point == 1);
    CHECK(join.rows[0].value == 29.5);
    CHECK(join.rows[0].sigma == 0.4);
    CHECK(join.rows[0].sites == 9);
    CHECK(join.rows[0].line == 3);
    CHECK(join.rows[2].point == 2);
    REQUIRE(join.unmatched.size() == 2); // 1 nm off, and a voltage that was not run
    CHECK(join.unmatched[0] == "split.csv:5: no point with amplitude 200 V, cd 31 nm");
    CHECK(join_measured(folder.load("")).rows.empty());
}

TEST_CASE("measured rows are written beside what is predicted at their points") {
    const StudyFolder folder;
    folder.write("split.csv", "amplitude_V, cd_mean_nm, sigma\n100, 2.5, 0.4\n300, 3, 0.4\n");
    const Study study =
        folder.load("vary:\n  plasmas.main.rf_bias.amplitude: [100 V, 200 V]\n"
                    "answer: {y: bow, x: amplitude}\n"
                    "compare: {measured: split.csv, join: [amplitude], value: cd_mean_nm, "
                    "sigma: sigma}\n");
    using Role = StudyTableColumn::Role;
    StudyTable table;
    for (const auto& [role, name] : {std::pair(Role::point, "point"),
                                     {Role::input, "amplitude"},
                                     {Role::metric, "bow"},
                                     {Role::error, "bow error"}}) {
        StudyTableColumn column;
        column.role = role;
        column.name = column.label = name;
        table.columns.push_back(column);
    }
    for (const char* cell : {"0001", "100", "2.75", "0.1", "0002", "200", "3", "0.1"})
        table.add_cell(cell);
    const std::string text = measured_csv(study, table);
    CHECK(text.find("# unmatched = split.csv:3: no point with amplitude 300 V\n") !=
          std::string::npos);
    CHECK(text.find("\n2,0001,2.5,0.4,,2.75,0.1,0.25\n") != std::string::npos);
}

TEST_CASE("effects are told for every metric of a table of results, the answer first") {
    const StudyFolder folder;
    const Study study = folder.load("vary:\n  mask.openings.line.cd: [30 nm, 60 nm]\n"
                                    "  plasmas.main.rf_bias.amplitude: [1 V, 2 V, 3 V, 4 V, 5 V]\n"
                                    "answer: {y: bow, x: amplitude, line_per: cd}\n");
    using Role = StudyTableColumn::Role;
    StudyTable table;
    const auto column = [&](Role role, const std::string& name, const std::string& unit) {
        StudyTableColumn one;
        one.role = role;
        one.name = one.label = name;
        one.unit = unit;
        table.columns.push_back(one);
    };
    column(Role::status, "status", "");
    column(Role::input, "cd", "nm");
    column(Role::input, "amplitude", "V");
    column(Role::metric, "depth centre", "nm");
    column(Role::error, "depth centre error", "nm");
    column(Role::metric, "bow", "nm");
    column(Role::error, "bow error", "nm");
    for (std::size_t i = 0; i < study.points; ++i) {
        const StudyPoint point = study_point(study, i);
        const double cd = *point.values[0].number, v = *point.values[1].number;
        const bool open = i == 9;
        for (const std::string& cell :
             {std::string(open ? "not cleared" : "done"), std::to_string(cd), std::to_string(v),
              std::to_string(10 * v), std::string("0.1"), std::to_string(0.5 * v + 0.01 * cd),
              std::string("0.01")})
            table.add_cell(cell);
    }
    const StudyEffects effects = study_effects(table, answer_columns(table, study));
    REQUIRE(effects.metrics.size() == 2);
    CHECK(effects.metrics[0].second.response == "bow");
    CHECK(effects.metrics[0].second.points == 9);
    CHECK(effects.metrics[0].second.left_out == 1); // a bound is no value
    CHECK(effects.metrics[1].second.axes[1].label == "amplitude");
    REQUIRE(effects.fits.size() == 2);
    CHECK(effects.fits[0].line.rfind("cd 30", 0) == 0);
    CHECK(effects.fits[0].model == "linear");
    CHECK(effects.fits[0].coefficients[1] == Approx(0.5).epsilon(1e-6));
    CHECK(effects.fits[1].coefficients[0] == Approx(0.6).epsilon(1e-6));
    const auto json = effects_json(table, effects);
    CHECK(json["metrics"].size() == 2);
    CHECK(json["fits"][0]["model"] == "linear");
    const std::string csv = effects_csv(table, effects);
    CHECK(csv.find("metric,unit,axis,axis_unit,quantity,from,to,value,low,high,points,note") !=
          std::string::npos);
    CHECK(csv.find("fit c1") != std::string::npos);
}
