// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/report/case_difference.hpp"
#include "engine/report/compare_page.hpp"
#include "engine/study/study_folder.hpp"
#include "tests/report/chart_samples.hpp"
#include "tests/report/study_samples.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::engine;
using tests::TemporaryFolder;

namespace {

nlohmann::json metric(const std::string& name, double value, double error,
                      const std::string& definition = "as always") {
    return {{"name", name},
            {"feature", "line"},
            {"value", value},
            {"unit", "nm"},
            {"sampling_error", error},
            {"grid_error", "not assessed"},
            {"definition", definition}};
}

void write_run(const std::string& folder, double bottom, double error, double bow,
               const std::string& amplitude, const std::string& definition = "as always") {
    std::filesystem::create_directories(folder);
    const nlohmann::json metrics = {
        {"title", "a trench"},
        {"time_s", 60},
        {"errors", ""},
        {"metrics", {metric("bottom cd", bottom, error, definition), metric("bow", bow, 0.3)}},
        {"clearing",
         {{{"feature", "line"}, {"film", "gate"}, {"cleared", true}, {"remaining_nm", 0}}}},
        {"targets",
         {{{"target", "bow: at most 4 nm"},
           {"metric", "bow"},
           {"feature", "line"},
           {"after", ""},
           {"value", bow},
           {"unit", "nm"},
           {"sampling_error", 0.3},
           {"verdict", bow < 4 ? "met" : "missed"},
           {"by_numbers", bow < 4 ? "met" : "missed"},
           {"reason", ""}}}}};
    std::ofstream(folder + "/metrics.json") << metrics.dump();
    std::ofstream(folder + "/profile.csv") << tests::profile_sample(bottom, 200);
    std::ofstream(folder + "/run.json") << R"({"status": "done", "title": "a trench"})";
    std::ofstream(folder + "/case.yaml")
        << "title: a trench\nmask: {openings: [{name: line, cd: 60 nm}]}\nplasmas: {main: "
           "{rf_bias: {amplitude: "
        << amplitude << "}}}\n";
}

bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

} // namespace

TEST_CASE("side by side: differences with errors combined, verdicts, inputs that differ") {
    const TemporaryFolder folder;
    write_run(folder.path + "/a/run", 60, 0.3, 3.0, "300 V");
    write_run(folder.path + "/b/run", 58, 0.4, 3.2, "400 V");
    write_run(folder.path + "/c", 61, 0.4, 5.0, "500 V", "somewhere else");
    const std::vector<std::string> runs = {folder.path + "/a/run", folder.path + "/b/run",
                                           folder.path + "/c"};
    const CompareReport report = compare_report(runs);
    const std::string html = page_html(report.page);
    if (const char* keep = std::getenv("RILLE_TEST_PICTURES"))
        std::ofstream(std::string(keep) + "/compare.html") << html;
    // Oracle: 58 - 60 with hypot(0.3, 0.4) = 0.5; 3.2 - 3.0 with hypot(0.3, 0.3) = 0.42.
    // Source: derived here.
    // Tolerance: text as shown.
    CHECK(has(html, "<strong>-2.0 ± 0.5 nm</strong>"));
    CHECK(has(html, ">+0.2 ± 0.4 nm<"));
    CHECK_FALSE(has(html, "<strong>+0.2 ± 0.4 nm")); // within its error
    CHECK(has(html, "defined otherwise"));
    CHECK(has(html, "plasmas.main.rf_bias.amplitude"));
    CHECK_FALSE(has(html, "mask.openings.line.cd"));
    for (const char* part :
         {"a/run", "b/run", "400 V", "missed", "cleared", "Grid error is not in"})
        CHECK(has(html, part));
    for (const std::string* svg :
         {&report.figures[0].svg, &report.figures[0].narrow, &report.figures[0].slide})
        CHECK(tests::text_faults(*svg) == std::vector<std::string>{});
}

TEST_CASE("side by side: folders that keep little, and one that is no run") {
    const TemporaryFolder folder;
    write_run(folder.path + "/a", 60, 0.3, 3.0, "300 V");
    write_run(folder.path + "/b", 60, 0, 3.0, "300 V");
    for (const char* name : {"/b/profile.csv", "/b/case.yaml", "/b/run.json"})
        std::filesystem::remove(folder.path + name);
    const std::string html =
        page_html(compare_report({folder.path + "/a", folder.path + "/b"}).page);
    CHECK(has(html, "no profile kept"));
    CHECK(has(html, "keeps no case.yaml"));
    std::filesystem::create_directories(folder.path + "/empty");
    CHECK_THROWS_AS(compare_report({folder.path + "/a", folder.path + "/empty"}), OutputError);
    std::ofstream(folder.path + "/b/metrics.json") << "{\"metrics\": [";
    CHECK_THROWS_AS(compare_report({folder.path + "/a", folder.path + "/b"}), OutputError);
}

TEST_CASE("side by side: links lead from the page to the runs") {
    const TemporaryFolder folder;
    write_run(folder.path + "/runs/a", 60, 0.3, 3.0, "300 V");
    write_run(folder.path + "/runs/b", 59, 0.3, 3.0, "300 V");
    OutputFolder out(folder.path + "/out", OutputFolder::Existing::refuse);
    write_comparison(out, {folder.path + "/runs/a", folder.path + "/runs/b"}, true);
    const std::string html = read_file(folder.path + "/out/report.html");
    CHECK(has(html, "href=\"../runs/a/\""));
    CHECK(has(html, "The cases are the same"));
    CHECK(read_file(folder.path + "/out/figures/profiles.png").size() > 1000);
}

TEST_CASE("values of a case by their names") {
    const auto values = case_values("a: 1\nlist: [{name: x, cd: 3 nm}, {name: y, cd: 4 nm}]\n"
                                    "words: [b, c]\nplain: [{k: v}]\n");
    CHECK(values.at("list.x.cd") == "3 nm");
    CHECK(values.at("words") == "[b, c]");
    CHECK(values.at("plain.1.k") == "v");
    CHECK(case_values("a: [").empty());
    const auto differences = case_differences({values, {{"a", "2"}, {"words", "[b, c]"}}});
    CHECK(differences.size() == values.size() - 1);
    CHECK(differences[0].path == "a");
}

TEST_CASE("side by side: points of a study differ in what the study varies") {
    const tests::StudyFolder folder;
    const Study study = folder.load("vary: {plasmas.main.rf_bias.amplitude: [100 V, 200 V], "
                                    "mask.openings.line.cd: [60 nm]}\n");
    const std::string out = folder.path("out");
    prepare_study_folder(out, study, study_sources(study), false);
    const auto write_point = [&](const std::string& name, std::size_t index, const char* volts) {
        const std::string point = out + "/points/" + name;
        write_run(point, 60 - double(index), 0.3, 3.0, "0 V");
        for (const char* file : {"/case.yaml", "/run.json"})
            std::filesystem::remove(point + file);
        std::ofstream(point + "/point.json")
            << nlohmann::json{{"point", index}, {"status", "done"}, {"values", {volts, "60 nm"}}};
        return point;
    };
    const std::string first = write_point("0001", 0, "100 V");
    const std::string second = write_point("0002", 1, "200 V");
    std::string html = page_html(compare_report({first, second + "/"}).page);
    CHECK(has(html, "plasmas.main.rf_bias.amplitude"));
    CHECK(has(html, "200 V"));
    CHECK_FALSE(has(html, "mask.openings.line.cd")); // 60 nm in both
    CHECK_FALSE(has(html, "keeps no case.yaml"));
    // A run of its own with the same case but for one value that the study does not vary.
    const std::string run = folder.path("run");
    write_run(run, 58, 0.3, 3.0, "0 V");
    std::string text = point_case(study, 0);
    const std::size_t at = text.find("thickness: 60 nm");
    REQUIRE(at != std::string::npos);
    std::ofstream(run + "/case.yaml") << text.replace(at, 16, "thickness: 55 nm");
    html = page_html(compare_report({first, run}).page);
    CHECK(has(html, "55 nm"));
    CHECK_FALSE(has(html, "rf_bias.amplitude"));
    // A study that was changed since is not asked.
    write_point("0002", 1, "300 V");
    CHECK(has(page_html(compare_report({first, second}).page), "lies in no study"));
}
