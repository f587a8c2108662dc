// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/study/study_schema.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille::engine;
using rille::tests::StudyFolder;

namespace {

const char* const grid = R"(title: two axes
vary:
  mask.openings.line.cd: [30 nm, 60 nm]
  plasmas.main.rf_bias.amplitude: {from: 100 V, to: 800 V, points: 8}
)";

std::vector<std::string> texts(const Study& study, std::size_t index) {
    std::vector<std::string> list;
    for (const StudyValue& value : study_point(study, index).values)
        list.push_back(value.text);
    return list;
}

bool has(const std::string& text, const std::string& part) {
    INFO(text);
    CHECK(text.find(part) != std::string::npos);
    return text.find(part) != std::string::npos;
}

} // namespace

TEST_CASE("a full grid is run with the last axis fastest") {
    const StudyFolder folder;
    const Study study = folder.load(grid);
    CHECK(study.points == 16);
    CHECK(study.plan == "full grid");
    REQUIRE(study.columns.size() == 2);
    CHECK(study.columns[0].path == "mask.openings.line.cd");
    CHECK(study.columns[0].label == "cd");
    CHECK(study.columns[0].unit == "nm");
    CHECK(study.columns[1].label == "amplitude");
    CHECK(study.columns[1].unit == "V");
    CHECK(texts(study, 0) == std::vector<std::string>{"30 nm", "100 V"});
    CHECK(texts(study, 1) == std::vector<std::string>{"30 nm", "200 V"});
    CHECK(texts(study, 15) == std::vector<std::string>{"60 nm", "800 V"});
    CHECK(study_point(study, 9).values[1].number == 200);
    CHECK(point_name(study, 0) == "0001");
    CHECK(point_name(study, 15) == "0016");
    CHECK_THROWS_AS(study_point(study, 16), std::out_of_range);
    const auto overrides = point_overrides(study, study_point(study, 2));
    CHECK(overrides == std::vector<std::string>{"mask.openings.line.cd=30 nm",
                                                "plasmas.main.rf_bias.amplitude=300 V"});
    const Case c = load_case(folder.path("case.yaml"), overrides);
    CHECK(c.mask.openings[0].width_x == 30);
    CHECK(c.plasmas.at("main").bias.value == 300);
    CHECK(c.plasmas.at("strip").bias.value == 300); // a copy follows
}

TEST_CASE("what a study leaves beside its points gives the same points again") {
    const StudyFolder folder;
    folder.write("response.csv", "amplitude [V], ion_flux [mA/cm2]\n100, 1.0\n400, 1.3\n");
    const Study study = folder.load("vary: {plasmas.main.rf_bias.amplitude: [100 V, 400 V]}\n"
                                    "linked: {plasmas.main.ion_flux: response.csv}\nrepeats: 2\n");
    folder.write("out/study.yaml", study.resolved_yaml);
    folder.write("out/base/case.yaml", study.base.resolved_yaml);
    for (const InputFile& file : study.inputs)
        folder.write("out/" + file.name, file.content);
    const std::string left = folder.path("out/study.yaml");
    for (const Study& again : {load_study(left), reload_study(left)}) {
        REQUIRE(again.points == study.points);
        for (std::size_t i = 0; i < study.points; ++i) {
            CHECK(texts(again, i) == texts(study, i));
            const auto overrides = point_overrides(again, study_point(again, i));
            const Case first = load_case(folder.path("case.yaml"), overrides);
            const Case second = load_case(folder.path("out/base/case.yaml"), overrides);
            CHECK(first.resolved_yaml == second.resolved_yaml);
        }
        CHECK(again.resolved_yaml == study.resolved_yaml);
        CHECK(again.constants == study.constants);
        CHECK(again.warnings == study.warnings);
        CHECK(again.base.resolved_yaml == study.base.resolved_yaml);
    }
}

TEST_CASE("ranges have exact ends and short texts") {
    const StudyFolder folder;
    const Study thirds = folder.load(
        "vary: {plasmas.main.rf_bias.amplitude: {from: 0.1 kV, to: 0.2 kV, points: 4}}\n");
    CHECK(texts(thirds, 1) == std::vector<std::string>{"0.133333333333 kV"});
    CHECK(texts(thirds, 3) == std::vector<std::string>{"0.2 kV"});
    const Study log = folder.load("vary: {plasmas.main.neutrals.Cl.flux: {from: 1e17 /cm2/s, to: "
                                  "1e19 /cm2/s, points: 3, scale: log}}\n");
    CHECK(texts(log, 1) == std::vector<std::string>{"1e+18 /cm2/s"});
    CHECK(log.columns[0].is_logarithmic);
    const Study over =
        folder.load("vary: {recipe.steps.main.time: {from: 2 s, to: 4 s, points: 3}}\n");
    CHECK(texts(over, 1) == std::vector<std::string>{"3 s"});
    CHECK(over.columns[0].unit == "s");
}

TEST_CASE("repeats change the seed alone") {
    const StudyFolder folder;
    const Study study = folder.load(std::string(grid) + "repeats: 3\n");
    CHECK(study.points == 48);
    CHECK(study.columns.back().path == "sampling.seed");
    CHECK(texts(study, 1) == std::vector<std::string>{"30 nm", "100 V", "2"});
    const std::string quiet = "plasmas: {main: {ion_flux: 0 mA/cm2}}\n";
    std::string still = StudyFolder::small_case;
    still.replace(still.find("ion_flux: 1.1"), 13, "ion_flux: 0  ");
    still.replace(still.find("    neutrals: {Cl: {flux: 3e18 /cm2/s, temperature: 400 K}}\n"), 60,
                  "");
    folder.write("case.yaml", still);
    has(folder.problems(std::string(grid) + "repeats: 3\n"),
        "study.yaml:7:10: repeats: nothing in the case is random");
}

TEST_CASE("words, files and lists of lengths can be varied") {
    const StudyFolder folder;
    const Study study = folder.load("vary:\n  mask.openings.line.cd_at: [mask bottom, mask top]\n"
                                    "  stack.film.thickness: [50 nm, 60 nm]\n");
    CHECK(study.columns[0].unit.empty());
    CHECK_FALSE(study_point(study, 0).values[0].number);
    CHECK(study.columns[1].unit == "nm");
    CHECK(study_point(study, 3).values[1].number == 60);
}

TEST_CASE("linked values follow their axis row by row or interpolated") {
    const StudyFolder folder;
    const std::string axis = "vary: {plasmas.main.rf_bias.amplitude: [100 V, 200 V, 0.3 kV]}\n";
    folder.write("all.csv", "amplitude [V], ion_flux [mA/cm2], cl [/cm2/s]\n300, 1.3, 1e18\n"
                            "100, 1.0, 2e18\n200, 1.1, 3e18\n");
    const Study exact =
        folder.load(axis + "linked:\n  plasmas.main.ion_flux: all.csv\n"
                           "  plasmas.main.neutrals.Cl.flux: {table: all.csv, column: cl}\n");
    CHECK(texts(exact, 2) == std::vector<std::string>{"0.3 kV", "1.3 mA/cm2", "1e18 /cm2/s"});
    CHECK(exact.columns[1].is_linked);
    has(exact.columns[1].follows, "all.csv, row by row within 0.01 %, not interpolated");
    CHECK(exact.inputs.size() == 1);
    folder.write("ends.csv", "amplitude [V], ion_flux [mA/cm2]\n100, 1.0\n300, 1.3\n");
    has(folder.problems(axis + "linked: {plasmas.main.ion_flux: ends.csv}\n"),
        "study.yaml:3:48: plasmas.main.ion_flux: ends.csv has no row for \"200 V\"; nearest are "
        "100 "
        "V and 300 V");
    const Study between =
        folder.load(axis + "linked: {plasmas.main.ion_flux: {table: ends.csv, between: linear}}\n");
    CHECK(texts(between, 1)[1] == "1.15 mA/cm2");
    has(between.columns[1].follows, "interpolated between its rows");
    has(folder.problems("vary: {plasmas.main.rf_bias.amplitude: [100 V, 301 V]}\nlinked: "
                        "{plasmas.main.ion_flux: {table: ends.csv, between: linear}}\n"),
        "ends.csv has no row for \"301 V\"; tables are not extrapolated");
}

TEST_CASE("a table names the points one by one") {
    const StudyFolder folder;
    folder.write("points.csv",
                 "mask.openings.line.cd [nm], plasmas.main.rf_bias.amplitude [V]\n30, 100\n"
                 "60, 250\n45, 120\n");
    const Study study = folder.load("plan: {table: points.csv}\n");
    CHECK(study.points == 3);
    CHECK(texts(study, 2) == std::vector<std::string>{"45 nm", "120 V"});
    folder.write("points.csv", "mask.openings.lime.cd [nm]\n30\n");
    has(folder.problems("plan: {table: points.csv}\n"),
        "points.csv:1:1: mask.openings.lime.cd: nothing is called \"lime\" there; did you mean "
        "\"line\"?");
    folder.write("points.csv", "mask.openings.line.cd [V]\n30\n");
    has(folder.problems("plan: {table: points.csv}\n"), "points.csv:2:1");
}

TEST_CASE("everything wrong with a study is told before anything runs, in one go") {
    const StudyFolder folder;
    const std::string report =
        folder.problems("vary:\n"
                        "  plasmas.main.rf_bais.amplitude: [100 V]\n"             // 4
                        "  mask.openings.line.cd: [30 V, 60 nm]\n"                // 5
                        "  mask.thickness: {from: -5 nm, to: 80 nm, points: 3}\n" // 6
                        "  recipe.wafer_temperature: {from: 20 degC, to: 330 K, points: 3}\n"
                        "  plasmas.main.presure: [8 mTorr]\n" // 8
                        "  mask: [30 nm]\n"                   // 9
                        "  plasmas.main.neutrals.Cl.flux: {from: 1e18 /cm2/s, to: 2e18 /cm2/s}\n"
                        "keep: [metrics, pictures]\n"                   // 11
                        "repeets: 3\n"                                  // 12
                        "answer: {y: bottom cd_lost, x: amplitude}\n"); // 13
    has(report, "study.yaml:4:35: plasmas.main.rf_bais.amplitude: nothing is called \"rf_bais\" "
                "there; did you mean \"rf_bias\"?");
    has(report, "study.yaml:5:27: mask.openings.line.cd: \"30 V\" is a voltage; a length is due");
    has(report, "study.yaml:6:26: mask.thickness: \"-5 nm\" is out of range; allowed is more than "
                "0 nm");
    has(report, "study.yaml:7:49: vary.recipe.wafer_temperature: \"20 degC\" and \"330 K\" have "
                "different units");
    has(report, "study.yaml:8:");
    has(report, "did you mean \"pressure\"?");
    has(report, "study.yaml:9:9: mask: is not a single value; name one below it: material");
    has(report, "study.yaml:10:34: vary.plasmas.main.neutrals.Cl.flux: a full grid needs to know");
    has(report, "study.yaml:11:17: keep[2]: \"pictures\" is not known here");
    has(report, "study.yaml:12:1: repeets: unknown key; did you mean \"repeats\"?");
    has(report, "no quantity is called \"bottom cd_lost\"");
    has(report, "did you mean \"bottom cd_loss\"?");
}

TEST_CASE("a study that cannot be is refused before any run") {
    const StudyFolder folder;
    has(folder.problems("vary: {mask.thickness: {from: 20 nm, to: 80 nm, points: 1000000}, "
                        "pitch: {from: 160 nm, to: 200 nm, points: 1000}}\n"),
        "vary: 1000000 x 1000 = 1e+09 points; a study has at most 1000000");
    has(folder.problems("vary: {mask.thickness: {from: 20 nm, to: 80 nm}}\nplan: {sobol: {points: "
                        "1000000000}}\n"),
        "\"1000000000\" is out of range; allowed is at least 1 and at most 1000000");
    has(folder.problems("vary: {mask.thickness: [20 nm, 20 nm]}\n"), "stands twice in the list");
    has(folder.problems("vary: {mask.thickness: [20 nm]}\nplan: every second\n"), "full grid");
    has(folder.problems("vary: {mask.thickness: [20 nm]}\nslurm: {retries: {numerics: 1}}\n"),
        "study.yaml:4:19: slurm.retries.numerics: a point that failed in numerics would fail "
        "again");
    has(folder.problems("vary: {plasmas.main.rf_bias.amplitude: [1 V]}\nanswer: {y: depth centre, "
                        "x: cd}\n"),
        "\"cd\" is not varied; there are: amplitude");
    // Only the whole case shows that an opening is wider than the period.
    has(folder.problems("vary: {mask.openings.line.cd: [60 nm, 170 nm]}\n"), "170 nm");
    folder.write("other.yaml", StudyFolder::small_case);
    CHECK_THROWS_AS(load_study(folder.path("other.yaml")), InputError);
}

TEST_CASE("the answer names a metric in either order of words") {
    const StudyFolder folder;
    for (const char* y : {"bottom cd_loss of line", "cd_loss of line at bottom"}) {
        const Study study = folder.load(std::string(grid) + "answer: {y: " + y +
                                        ", x: rf_bias.amplitude, line_per: line.cd}\n");
        CHECK(study.answer.y == "bottom cd_loss");
        CHECK(study.answer.feature == "line");
        CHECK(study.answer.x == 1);
        CHECK(study.answer.line_per == 0);
    }
    has(folder.problems(std::string(grid) + "answer: {y: bow of lane, x: cd}\n"),
        "no opening is called \"lane\"; there are: line; did you mean \"line\"?");
}

TEST_CASE("keep, compare and the cluster's settings are read") {
    const StudyFolder folder;
    folder.write("split.csv", "amplitude_V, cd [nm], cd_mean_nm, sigma\n100, 30, 29, 1\n");
    const Study study = folder.load(
        std::string(grid) +
        "compare: {measured: split.csv, join: [amplitude, cd], value: cd_mean_nm, sigma: sigma}\n"
        "keep: {each: [metrics, picture], failed: all}\n"
        "slurm: {partition: short, time: 20 min per point, memory: 2 GB, points_per_task: 8, "
        "at_most: 60 tasks, lines: [\"module load gcc/12\"], retries: {killed: 3}}\n");
    REQUIRE(study.comparison);
    CHECK(study.comparison->join == std::vector<std::size_t>{1, 0});
    CHECK(study.comparison->sigma == "sigma");
    CHECK(study.comparison->sites.empty());
    CHECK(study.keep.each ==
          std::vector<StudyKeep::Part>{StudyKeep::Part::metrics, StudyKeep::Part::picture});
    CHECK(study.slurm.partition == "short");
    CHECK(study.slurm.seconds_per_point == 1200);
    CHECK(study.slurm.memory_mb == 2000);
    CHECK(study.slurm.points_per_task == 8);
    CHECK(study.slurm.at_most_tasks == 60);
    CHECK(study.slurm.lines == std::vector<std::string>{"module load gcc/12"});
    CHECK(study.slurm.retries_killed == 3);
    CHECK(study.slurm.warn_before_kill_s == 120);
    has(folder.problems(std::string(grid) + "slurm: {time: soon, memory: 2 V}\n"),
        "\"2 V\" is no amount of memory");
}

TEST_CASE("the plan says what stays constant and warns of it") {
    const StudyFolder folder;
    const Study bias = folder.load(grid);
    CHECK(bias.warnings.empty());
    const std::string text = plan_text(bias);
    has(text, "plan: full grid, 16 runs");
    has(text, "constant: ion_flux of main stays 1.1 mA/cm2 while rf_bias.amplitude changes");
    has(text, "constant: pitch stays 160 nm while cd changes");
    has(text, "constant: time of step main stays 4 s");
    has(text, "100 V, 200 V, 300 V, 400 V, 500 V, 600 V, 700 V, 800 V (8 values)");
    const Study pressure = folder.load("vary: {plasmas.main.pressure: [4 mTorr, 8 mTorr]}\n");
    REQUIRE(pressure.warnings.size() == 2);
    has(pressure.warnings[0], "pressure of main varies while ion_flux and flux of Cl stay");
    has(pressure.warnings[1], "pressure of main is not used by the model");
    has(pressure.constants[0], "ion_flux of main stays 1.1 mA/cm2 while pressure changes");
    folder.write("flux.csv", "pressure [mTorr], ion_flux [mA/cm2], Cl [/cm2/s]\n4, 1.0, 1e18\n"
                             "8, 1.2, 2e18\n");
    const Study linked =
        folder.load("vary: {plasmas.main.pressure: [4 mTorr, 8 mTorr]}\nlinked:\n"
                    "  plasmas.main.ion_flux: flux.csv\n"
                    "  plasmas.main.neutrals.Cl.flux: {table: flux.csv, column: Cl}\n");
    REQUIRE(linked.warnings.size() == 1);
    has(linked.warnings[0], "only what is linked to it changes");
    for (const std::string& constant : linked.constants)
        CHECK(constant.find("ion_flux") == std::string::npos);
}

TEST_CASE("the schema of study files is JSON Schema") {
    const std::string schema = study_json_schema();
    has(schema, "rille study file");
    has(schema, "latin hypercube");
}
