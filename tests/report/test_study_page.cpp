// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_page.hpp"
#include "engine/report/study_parts.hpp"
#include "tests/report/chart_samples.hpp"
#include "tests/report/study_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::engine;
using tests::StudySample;
using tests::TemporaryFolder;

namespace {

/// Leaves pages for the eye and the browser where RILLE_TEST_PICTURES names a folder.
std::string page_of(const std::string& folder, const std::string& keep_as = "") {
    const std::string html = page_html(study_report(folder).page);
    const char* keep = std::getenv("RILLE_TEST_PICTURES");
    if (keep && !keep_as.empty())
        std::ofstream(std::string(keep) + "/" + keep_as + ".html") << html;
    return html;
}

bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

std::string some_fail(std::size_t i) {
    return i == 3 ? "failed" : i == 11 ? "killed" : i < 2 ? "not cleared" : i == 39 ? "" : "done";
}

} // namespace

TEST_CASE("study page: the curve, maps, profiles, table and failures") {
    const TemporaryFolder folder;
    StudySample sample;
    sample.status = some_fail;
    write_study(folder.path, sample);
    const StudyReport report = study_report(folder.path);
    const std::string html = page_of(folder.path, "study");
    for (const char* part :
         {"39 of 40 points finished", "bottom CD loss against amplitude",
          "CD loss against rf bias &lt;five openings&gt;", "pressure of main stays 10 mTorr",
          "14 published", "id=\"final-profiles\"", "id=\"maps\"", "id=\"process-window\"",
          "id=\"points\"", "id=\"failures\"", "a &quot;rate&quot; that is not finite",
          "Open markers: not cleared", "No value from 2 points: 0004, 0012.", "rises throughout",
          "not a released recipe"})
        CHECK(has(html, part));
    REQUIRE_FALSE(report.figures.empty());
    CHECK(report.figures[0].id == "answer");
    for (const Figure& figure : report.figures)
        for (const std::string* svg : {&figure.svg, &figure.narrow, &figure.slide}) {
            // An escaped letter is as wide as one letter.
            const std::string plain = std::regex_replace(*svg, std::regex("&[a-z]+;"), "_");
            CHECK(tests::text_faults(plain) == std::vector<std::string>{});
            CHECK(
                has(*svg, "pressure of main stays 10 mTorr")); // every figure says what is constant
        }
}

TEST_CASE("study page: the table has the digits of results.csv") {
    const TemporaryFolder folder;
    StudySample sample;
    sample.status = some_fail;
    write_study(folder.path, sample);
    const StudyView view = read_study_view(folder.path);
    const nlohmann::json data = nlohmann::json::parse(points_json(view));
    REQUIRE(data["rows"] == 39);
    REQUIRE(data["columns"].size() == view.table.columns.size());
    for (std::size_t c = 0; c < view.table.columns.size(); ++c)
        for (std::size_t row = 0; row < view.table.rows(); ++row) {
            const nlohmann::json& cells = data["cells"][c];
            const std::string text(view.table.text(row, c));
            if (cells.is_array()) {
                CHECK(cells[row].is_null() == text.empty());
                if (!text.empty()) CHECK(cells[row].get<double>() == std::stod(text));
            } else {
                CHECK(cells["words"][cells["at"][row].get<std::size_t>()] == text);
            }
        }
    CHECK(data["cells"][view.y.value()][5].get<double>() == sample.loss(5));
}

TEST_CASE("study page: an empty one, one point, all failed, nothing asked") {
    const TemporaryFolder folder;
    StudySample sample;
    SECTION("nothing has been run") {
        sample.status = [](std::size_t) { return ""; };
        write_study(folder.path, sample);
        const std::string html = page_of(folder.path, "study_empty");
        CHECK(has(html, "No point of this study has been run yet"));
        CHECK(has(html, "0 of 40 points finished"));
    }
    SECTION("begun, without a table of results") {
        write_study(folder.path, sample);
        std::filesystem::remove(folder.path + "/results.csv");
        const std::string html = page_of(folder.path);
        CHECK(has(html, "No point of this study has been run yet"));
        CHECK(has(html, "pressure of main stays 10 mTorr"));
    }
    SECTION("one point") {
        sample.amplitudes = {300};
        sample.openings = {60};
        write_study(folder.path, sample);
        const StudyReport report = study_report(folder.path);
        CHECK(report.figures.size() >= 2);
        CHECK(has(page_of(folder.path, "study_one"), "1 of 1 points finished"));
    }
    SECTION("all failed") {
        sample.status = [](std::size_t i) { return i % 2 ? "failed" : "killed"; };
        write_study(folder.path, sample);
        const std::string html = page_of(folder.path, "study_failed");
        CHECK(has(html, "No point has a value of bottom CD loss"));
        CHECK(has(html, "id=\"failures\""));
    }
    SECTION("no curve asked for") {
        sample.asks = false;
        write_study(folder.path, sample);
        const std::string html = page_of(folder.path);
        CHECK(has(html, "asks for no curve"));
        CHECK(has(html, "id=\"points\""));
    }
    SECTION("not a study") {
        CHECK_THROWS_AS(study_report(folder.path), OutputError);
    }
    SECTION("a damaged manifest") {
        write_study(folder.path, sample);
        std::ofstream(folder.path + "/study.json") << "{\"format\": 1";
        CHECK_THROWS_AS(study_report(folder.path), OutputError);
    }
}

TEST_CASE("study page: measured rows lie beside their points") {
    const TemporaryFolder folder;
    const StudySample sample;
    write_study(folder.path, sample);
    const std::string point(read_study_view(folder.path).point(18));
    std::ofstream(folder.path + "/measured.csv")
        << "# unmatched = cd.csv:4: no point with amplitude 350 V\n"
           "line,point,measured,sigma,sites,predicted,predicted_error,difference\n2,"
        << point << ",3.2,0.4,9,3.1,0.01,-0.1\n3,0001,4.4,,,4.3,0.01,-0.1\n";
    nlohmann::json manifest = nlohmann::json::parse(read_file(folder.path + "/study.json"));
    manifest["comparison"] = {{"file", "inputs/cd.csv"}};
    std::ofstream(folder.path + "/study.json") << manifest.dump();
    const MeasuredRows rows = measured_rows(read_study_view(folder.path));
    REQUIRE(rows.rows.size() == 2);
    CHECK(rows.unmatched == 1);
    CHECK(rows.rows[0].rows == std::vector<std::size_t>{18}); // 300 V of the third opening
    CHECK(rows.rows[0].sigma == 0.4);
    CHECK_FALSE(rows.rows[1].sigma);
    const std::string html = page_of(folder.path, "study_measured");
    CHECK(has(html, "60 nm, measured"));
    CHECK(has(html, "1 measured row belongs to no point"));
}

TEST_CASE("study page: answer.svg, answer.png and report.html are written") {
    const TemporaryFolder folder;
    write_study(folder.path, StudySample{});
    OutputFolder out(folder.path, OutputFolder::Existing::keep);
    write_study_report(out);
    CHECK(has(read_file(folder.path + "/answer.svg"), "bottom CD loss (nm)"));
    const std::string png = read_file(folder.path + "/answer.png");
    CHECK(png.substr(1, 3) == "PNG");
    // Width and height stand big-endian in the first chunk.
    const auto at = [&](std::size_t i) { return static_cast<unsigned char>(png[i]); };
    CHECK(at(18) * 256 + at(19) == 1920);
    CHECK(at(22) * 256 + at(23) == 1080);
    CHECK(has(read_file(folder.path + "/report.html"), "<!DOCTYPE html>"));
}

TEST_CASE("study page: what matters most, from effects.json") {
    const TemporaryFolder folder;
    write_study(folder.path, StudySample{});
    const auto axis = [](const char* name, double share) {
        return nlohmann::json{{"axis", name},         {"unit", "V"},
                              {"span", 4.2},          {"levels", nlohmann::json::array()},
                              {"first_order", share}, {"low", share - 0.05},
                              {"high", share + 0.02}};
    };
    const nlohmann::json effects = {{"metrics",
                                     {{{"metric", "bottom cd_loss"},
                                       {"unit", "nm"},
                                       {"method", "analysis of variance on the full grid"},
                                       {"axes", {axis("cd", 0.3), axis("rf_bias.amplitude", 0.66)}},
                                       {"together", 0.04}}}},
                                    {"fits",
                                     {{{"line", "cd 30 nm"},
                                       {"model", "linear"},
                                       {"reason", "chi-squared 3.1 of 6"},
                                       {"coefficients", {0.5, 0.006}},
                                       {"errors", {0.01, 0.0002}},
                                       {"x_low", 100},
                                       {"x_high", 800}}}}};
    std::ofstream(folder.path + "/effects.json") << effects.dump();
    const StudyReport report = study_report(folder.path);
    const std::string html = page_of(folder.path, "study_effects");
    for (const char* part : {"What moves the bottom CD loss most", "rf bias amplitude", "66 %",
                             "61 % to 68 %", "(0.5 ± 0.01) + (0.006 ± 0.0002) x", "4 % is left to"})
        CHECK(has(html, part));
    for (const Figure& figure : report.figures)
        CHECK(tests::text_faults(figure.svg) == std::vector<std::string>{});
    std::ofstream(folder.path + "/effects.json") << R"({"metrics": [7]})";
    CHECK_NOTHROW(study_report(folder.path));
}

TEST_CASE("study page: outlines of profile.csv keep their shape") {
    const Section section = profile_outline(tests::profile_sample(60, 200), 0.1);
    REQUIRE(section.size() == 1);
    CHECK_FALSE(section[0].closed);
    CHECK(section[0].points.size() < 20);
    CHECK(section[0].points.front()[0] == Approx(-120));
    CHECK(section[0].points.back()[0] == Approx(120).margin(1));
    double left = 0, right = 0;
    REQUIRE(walls_at(section, -100, 0, left, right));
    CHECK(right - left == Approx(60).margin(0.2));
    CHECK(profile_outline("", 0.1).empty());
    CHECK(profile_outline("nothing of the kind\n1,2\n", 0.1).empty());
}

TEST_CASE("study page: slices of further axes, plans that are no grid") {
    const TemporaryFolder folder;
    StudySample sample;
    sample.amplitudes.clear();
    sample.openings = {60};
    for (int i = 0; i < 60; ++i) // as of a hypercube: no two alike
        sample.amplitudes.push_back(100 + 11.7 * i);
    write_study(folder.path, sample);
    nlohmann::json manifest = nlohmann::json::parse(read_file(folder.path + "/study.json"));
    manifest["answer"]["line_per"] = nullptr;
    std::ofstream(folder.path + "/study.json") << manifest.dump();
    const StudyView view = read_study_view(folder.path);
    CHECK(study_slices(view, {0}, 12).size() == 1);
    CHECK(answer_charts(view, {}).size() == 1);
    sample.amplitudes = {100, 200, 300};
    sample.openings = {30, 60};
    write_study(folder.path, sample);
    std::ofstream(folder.path + "/study.json") << manifest.dump();
    const StudyView grid = read_study_view(folder.path);
    const auto charts = answer_charts(grid, {}); // cd is a further axis: a slice for each value
    REQUIRE(charts.size() == 2);
    CHECK(charts[0].first == "CD 30 nm");
}

TEST_CASE("study page: the points of a hypercube stand against each input") {
    const TemporaryFolder folder;
    StudySample sample;
    sample.is_grid = false;
    sample.amplitudes.clear();
    sample.openings.clear();
    for (int i = 0; i < 40; ++i) { // every part of both axes once
        sample.amplitudes.push_back(100 + 17.5 * i);
        sample.openings.push_back(30 + 4.25 * ((i * 17) % 40));
    }
    sample.status = [](std::size_t i) {
        return i == 3 ? "failed" : i < 2 ? "not cleared" : "done";
    };
    write_study(folder.path, sample);
    const StudyView view = read_study_view(folder.path);
    const auto charts = scatter_charts(view, view.y.value());
    REQUIRE(charts.size() == 2); // the linked ion flux has none
    CHECK(charts[0].text.title == "bottom CD loss against amplitude");
    CHECK(charts[1].text.title == "bottom CD loss against CD");
    for (const LineChart& chart : charts) {
        REQUIRE(chart.lines.size() == 1);
        CHECK_FALSE(chart.lines[0].is_joined);
        REQUIRE(chart.lines[0].points.size() == 39);
        int open = 0;
        for (const ChartPoint& point : chart.lines[0].points) {
            const std::size_t row = std::stoul(point.key);
            CHECK(point.y == Approx(sample.loss(row)));
            CHECK(point.error == Approx(StudySample::error(row)));
            CHECK(point.x ==
                  Approx(&chart == &charts[0] ? sample.amplitude(row) : sample.opening(row)));
            open += point.is_open;
        }
        CHECK(open == 2);
        REQUIRE(chart.text.notes.size() == 2);
        CHECK(has(chart.text.notes[0], "Open markers"));
        CHECK(chart.text.notes[1] == "No value from 1 point.");
    }
    const auto answer = answer_charts(view, {}); // hardly two points share a CD: no lines by it
    REQUIRE(answer.size() == 1);
    REQUIRE(answer[0].second.lines.size() == 1);
    CHECK(answer[0].second.lines[0].points.size() == 39);
    const StudyReport report = study_report(folder.path);
    const std::string html = page_of(folder.path, "study_hypercube");
    CHECK(has(html, "id=\"scatter\""));
    CHECK(has(html, "do not line up"));
    CHECK_FALSE(has(html, "id=\"maps\""));
    for (const Figure& figure : report.figures)
        for (const std::string* svg : {&figure.svg, &figure.slide})
            CHECK(tests::text_faults(std::regex_replace(*svg, std::regex("&[a-z]+;"), "_")) ==
                  std::vector<std::string>{});
    // The points of a grid line up: maps instead.
    write_study(folder.path, StudySample{});
    CHECK_FALSE(has(page_of(folder.path), "id=\"scatter\""));
}

TEST_CASE("study page: ten thousand points stay small and quick") {
    const TemporaryFolder folder;
    StudySample sample;
    sample.amplitudes.clear();
    sample.openings.clear();
    for (int i = 0; i < 100; ++i) {
        sample.amplitudes.push_back(100 + 7 * i);
        sample.openings.push_back(20 + 3 * i);
    }
    sample.more_metrics = 15;
    sample.has_profiles = false;
    write_study(folder.path, sample);
    const std::string html = page_of(folder.path, "study_10000");
    CHECK(html.size() < 16e6);
    CHECK(has(html, "10000 of 10000 points finished"));
    CHECK(has(html, "Shown: 32 of 100 values of amplitude, 32 of 100 values of CD."));
}
