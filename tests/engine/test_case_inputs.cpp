// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/output_folder.hpp"
#include "engine/run_output.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <fstream>
#include <nlohmann/json.hpp>

using namespace rille::engine;
using rille::tests::ScratchFolder;
namespace fs = std::filesystem;

namespace {

const std::string table = "# quantity=flux_fraction_per_bin\n# energy_reference=wafer\n"
                          "# source=test\nE_lo_eV,E_hi_eV,weight\n90,110,1\n";

void put(const std::string& path, const std::string& text) {
    fs::create_directories(fs::path(path).parent_path());
    std::ofstream(path) << text;
}

/// The trench example with a chemistry and two tables of the same file name beside it.
void lay_out(const std::string& folder) {
    const std::string root = RILLE_ROOT;
    std::string text = read_file(root + "/examples/poly-trench/case.yaml");
    const auto replace = [&](const std::string& old, const std::string& now) {
        const std::size_t at = text.find(old);
        REQUIRE(at != std::string::npos);
        text.replace(at, old.size(), now);
    };
    replace("rf_bias: {frequency: 13.56 MHz, amplitude: 115 V}",
            "ion_energies: {Cl2+: {file: a/ions.csv}, Ar+: {file: b/ions.csv}}");
    replace("chemistry: silicon-cl2-ar", "chemistry: own.yaml");
    put(folder + "/case.yaml", text);
    put(folder + "/own.yaml", read_file(root + "/configs/chemistries/silicon-cl2-ar.yaml"));
    put(folder + "/a/ions.csv", table);
    put(folder + "/b/ions.csv", table + "110,130,1\n");
}

} // namespace

TEST_CASE("a run keeps copies of the files that its case names", "[inputs]") {
    const ScratchFolder scratch;
    lay_out(scratch / "here");
    const Case c = load_case(scratch / "here/case.yaml");
    REQUIRE(c.inputs.size() == 3);
    CHECK(c.inputs[0].name == "inputs/ions.csv");
    CHECK(c.inputs[1].name == "inputs/ions-2.csv"); // another file of the same name
    CHECK(c.inputs[2].name == "inputs/own.yaml");
    CHECK(c.inputs[1].content == table + "110,130,1\n");
    CHECK(c.resolved_yaml.find(scratch.path()) == std::string::npos);
    CHECK(c.shown_yaml.find(scratch / "here/own.yaml") != std::string::npos);

    OutputFolder folder(scratch / "out", OutputFolder::Existing::refuse);
    RunOutput output(folder, c);
    CHECK(record_json(c, {}, {})["inputs"][2]["read_from"] == scratch / "here/own.yaml");
    // Elsewhere, without the originals, it is the same case; and keeping it again changes nothing.
    fs::remove_all(scratch / "here");
    fs::rename(scratch / "out", scratch / "moved");
    const Case again = load_case(scratch / "moved/case.yaml");
    CHECK(again.resolved_yaml == c.resolved_yaml);
    REQUIRE(again.inputs.size() == 3);
    for (int i = 0; i < 3; ++i) {
        CHECK(again.inputs[i].name == c.inputs[i].name);
        CHECK(again.inputs[i].content == c.inputs[i].content);
    }
    const auto& energies = again.plasmas.at("main").ion_energies;
    CHECK(energies.at("Cl2+").mean_energy_ev() == Approx(100));
    CHECK(energies.at("Ar+").mean_energy_ev() == Approx(110));
    // The fault: without its copy the case is refused.
    fs::remove(scratch / "moved/inputs/ions-2.csv");
    CHECK_THROWS_AS(load_case(scratch / "moved/case.yaml"), InputError);
}

TEST_CASE("a case that names no files keeps none", "[inputs]") {
    const Case c = load_case(std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml");
    CHECK(c.inputs.empty());
    CHECK(c.shown_yaml == c.resolved_yaml);
}

TEST_CASE("how often arrivals are renewed is a key of the case", "[inputs]") {
    const std::string path = std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml";
    CHECK(load_case(path).refresh_move == 0.5);
    CHECK(load_case(path, {"sampling.renew_after=20 %"}).refresh_move == Approx(0.2));
    for (const char* bad :
         {"sampling.renew_after=0 %", "sampling.renew_after=420 %", "sampling.renew_after=0.5"})
        CHECK_THROWS_AS(load_case(path, {bad}), InputError);
}
