// SPDX-License-Identifier: Apache-2.0
#include "engine/state_table.hpp"

#include <catch2/catch.hpp>
#include <fmt/format.h>

#include <filesystem>
#include <fstream>

using namespace rille::engine;

namespace {

// ion flux = 1 + power / 1000 W + pressure / 10 mTorr: linear in both, so interpolation is exact.
const char* const table = "source_power [W],pressure [mTorr],ion_flux [mA/cm2],ions.Ar+ [%]\n"
                          "500,5,2.0,40\n500,10,2.5,50\n1000,5,2.5,40\n1000,10,3.0,50\n";

struct Document {
    std::filesystem::path file = std::filesystem::temp_directory_path() / "rille_states_test.csv";
    YamlNode root;
    Problems problems;

    Document(const std::string& csv, const std::string& at, const std::string& own = "") {
        std::ofstream(file) << csv;
        root = read_yaml_text(fmt::format("plasmas:\n  main:\n    state: {{table: {}, at: {}}}\n{}",
                                          file.string(), at, own),
                              "case.yaml", problems);
        apply_state_tables(root, problems);
    }
    ~Document() { std::filesystem::remove(file); }
    std::string value(const char* key) {
        const YamlNode* node = root.find("plasmas")->find("main")->find(key);
        return node ? node->text : "absent";
    }
    std::string report() { return problems.empty() ? "" : describe(problems.sorted()[0]); }
};

} // namespace

// Oracle: a bilinear function at a point between the rows. Source: derived here.
// Tolerance: 1e-12, round-off.
TEST_CASE("a plasma state is interpolated between set points", "[states]") {
    Document inside(table, "{source_power: 0.8 kW, pressure: 7.5 mTorr}");
    CHECK(inside.report().empty());
    CHECK(std::stod(inside.value("ion_flux")) == Approx(2.55).epsilon(1e-12));
    const YamlNode* ions = inside.root.find("plasmas")->find("main")->find("ions");
    REQUIRE(ions);
    CHECK(ions->find("Ar+")->text == "45 %");

    Document corner(table, "{source_power: 1000 W, pressure: 10 mTorr}");
    CHECK(corner.value("ion_flux") == "3 mA/cm2");

    Document own(table, "{source_power: 500 W, pressure: 5 mTorr}", "    ion_flux: 9 mA/cm2\n");
    CHECK(own.value("ion_flux") == "9 mA/cm2"); // what the case says itself stands
}

TEST_CASE("states are never extrapolated and tables must fit", "[states]") {
    CHECK(Document(table, "{source_power: 1200 W, pressure: 7 mTorr}")
              .report()
              .find("\"1200 W\" lies outside the table, which holds 500 to 1000 W; states are not "
                    "extrapolated") != std::string::npos);
    CHECK(Document(table, "{source_power: 700 V, pressure: 7 mTorr}").report().find("a power is") !=
          std::string::npos);
    CHECK(Document(table, "{sourcepower: 700 W, pressure: 7 mTorr}")
              .report()
              .find("did you mean \"source_power\"") != std::string::npos);
    std::string hole = table;
    hole.erase(hole.find("1000,10,"));
    CHECK(Document(hole, "{source_power: 700 W, pressure: 7 mTorr}")
              .report()
              .find("there is no row for source_power 1000 W, pressure 10 mTorr") !=
          std::string::npos);
    std::string bare = table;
    bare.replace(bare.find(" [W]"), 4, "");
    CHECK(Document(bare, "{source_power: 700 W, pressure: 7 mTorr}")
              .report()
              .find("rille_states_test.csv:1:1: \"source_power\": the column needs its unit") == 0);
    std::string nan = table;
    nan.replace(nan.find("2.5"), 3, "nan");
    CHECK(Document(nan, "{source_power: 700 W, pressure: 7 mTorr}")
              .report()
              .find("rille_states_test.csv:3:8: \"nan\" is not a finite number") == 0);
}
