// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/study/point_record.hpp"
#include "engine/study/results.hpp"
#include "engine/study/study_names.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>
#include <fmt/format.h>

using namespace rille;
using namespace rille::engine;
using Catch::Contains;
using tests::StudyFolder;
using Role = StudyTableColumn::Role;

namespace {

constexpr const char* three_points =
    "title: three points\n"
    "vary: {plasmas.main.rf_bias.amplitude: [100 V, 150 V, 200 V]}\n"
    "plan: full grid\n";

PointRecord record_of(std::size_t index, const std::string& status) {
    PointRecord record;
    record.point = index;
    record.name = fmt::format("{:04}", index + 1);
    record.status = status;
    record.seconds = 1.25;
    record.warnings = {"one", "two"};
    record.standing = {{fluxes::Standing::measured, 2}, {fluxes::Standing::illustrative, 7}};
    record.cpu_features_hash = "a";
    return record;
}

void put(const StudyFolder& folder, const PointRecord& record, const std::string& metrics) {
    folder.write("points/" + record.name + "/point.json", point_record_text(record));
    if (!metrics.empty()) folder.write("points/" + record.name + "/metrics.json", metrics);
}

std::string metrics_text(const std::string& metrics, const std::string& verdict) {
    return "{\"metrics\": [" + metrics +
           "], \"targets\": [{\"metric\": \"bow\", \"feature\": \"line\", \"verdict\": \"" +
           verdict + "\"}]}";
}

std::string metric(const std::string& name, const std::string& value, const std::string& unit) {
    return fmt::format("{{\"name\": \"{}\", \"feature\": \"line\", \"value\": {}, \"unit\": "
                       "\"{}\", \"sampling_error\": 0.25, \"definition\": \"how wide | it is\"}}",
                       name, value, unit);
}

} // namespace

TEST_CASE("results are written in one pass and read back", "[results]") {
    const StudyFolder folder;
    const Study study = folder.load(three_points);
    put(folder, record_of(0, "done"), metrics_text(metric("bow", "-0.0", "nm"), "met"));
    PointRecord failed = record_of(1, "failed");
    failed.failure = "no end: \"depth\", 3 cells\nsecond line";
    put(folder, failed, metrics_text(metric("bow", "5", "nm"), "missed")); // not a result
    put(folder, record_of(2, "not cleared"),
        metrics_text(metric("bow", "1.5", "nm") + "," + metric("selectivity", "null", "1"),
                     "undecided"));
    const StudyResults results = write_study_results(folder.path(""), study);
    CHECK(results.counts.done == 1);
    CHECK(results.counts.not_cleared == 1);
    CHECK(results.counts.failed == 1);
    CHECK(results.counts.missing() == 0);
    REQUIRE(results.failures.size() == 1);
    CHECK(results.failures[0].point == "0002");
    CHECK(results.warnings.empty());

    const StudyTable table = read_study_table(folder.path(""));
    CHECK(table.title == "three points");
    CHECK(table.constants == study.constants);
    REQUIRE(table.rows() == 3);
    const auto input = table.find("amplitude_V");
    REQUIRE(input);
    CHECK(table.all(Role::input) == std::vector<std::size_t>{*input});
    CHECK(table.columns[*input].path == "plasmas.main.rf_bias.amplitude");
    CHECK(table.columns[*input].unit == "V");
    CHECK(table.number(1, *input) == 150.0);
    const auto bow = table.metric("bow");
    REQUIRE(bow);
    CHECK(table.columns[*bow].name == "bow_nm");
    CHECK(table.columns[*bow].feature == "line");
    CHECK(table.columns[*bow].definition == "how wide   it is"); // bars part the description
    CHECK(table.text(0, *bow) == "0");
    CHECK_FALSE(table.number(1, *bow)); // of a failed point
    CHECK(table.number(2, *bow) == 1.5);
    CHECK(table.number(2, *table.error_of(*bow)) == 0.25);
    const auto selectivity = table.find("selectivity"); // appears at the last point only
    REQUIRE(selectivity);
    for (std::size_t row = 0; row < 3; ++row)
        CHECK(table.text(row, *selectivity).empty());
    CHECK_FALSE(table.metric("depth"));
    CHECK(table.text(2, *table.find(Role::status)) == "not cleared");
    CHECK(table.text(0, *table.find(Role::target)) == "met");
    CHECK(table.text(1, *table.find(Role::failure)) == "no end: \"depth\", 3 cells second line");
    CHECK(table.number(0, *table.find("parameters_published")) == 0.0);
    CHECK(table.number(0, *table.find("parameters_illustrative")) == 7.0);
    CHECK(table.number(0, *table.find("warnings")) == 2.0);
    CHECK(table.number(0, *table.find(Role::seconds)) == 1.25);
}

TEST_CASE("points made on two kinds of processors are told", "[results]") {
    const StudyFolder folder;
    const Study study = folder.load(three_points);
    const std::string metrics = metrics_text(metric("bow", "1", "nm"), "met");
    put(folder, record_of(0, "done"), metrics);
    PointRecord other = record_of(1, "done");
    other.cpu_features_hash = "b";
    put(folder, other, metrics);
    const StudyResults results = write_study_results(folder.path(""), study);
    CHECK(results.counts.missing() == 1);
    REQUIRE(results.warnings.size() == 1);
    CHECK_THAT(results.warnings[0], Contains("2 kinds of processors"));
    CHECK_THAT(read_study_table(folder.path("")).warnings.back(), Contains("2 kinds"));
}

TEST_CASE("a damaged table is refused", "[results]") {
    const StudyFolder folder;
    const Study study = folder.load(three_points);
    CHECK_THROWS_AS(read_study_table(folder.path("")), OutputError);
    put(folder, record_of(0, "done"), metrics_text(metric("bow", "1", "nm"), "met"));
    write_study_results(folder.path(""), study);
    const std::string whole = read_file(folder.path(study_names::results));
    CHECK_NOTHROW(read_study_table(folder.path("")));
    folder.write(study_names::results, whole.substr(0, whole.size() - 20));
    CHECK_THROWS_WITH(read_study_table(folder.path("")), Contains("cells"));
    folder.write(study_names::results, "point,status\n0001,done\n");
    CHECK_THROWS_WITH(read_study_table(folder.path("")), Contains("columns"));
    folder.write("points/0001/metrics.json", "{");
    CHECK_THROWS_AS(write_study_results(folder.path(""), study), OutputError);
}

TEST_CASE("a study without points writes a table without rows", "[results]") {
    const StudyFolder folder;
    const Study study = folder.load(three_points);
    CHECK(write_study_results(folder.path(""), study).counts.missing() == 3);
    const StudyTable table = read_study_table(folder.path(""));
    CHECK(table.rows() == 0);
    CHECK(table.find("amplitude_V"));
}
