// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "tests/support/chemistry_files.hpp"

#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>
#include <optional>
#include <string>
#include <utility>

using namespace rille::engine;
namespace fluxes = rille::fluxes;

namespace {

const std::string cited = ", standing: illustrative, source: s}";

struct Texts {
    std::string section = "  Si: {film: Si, sticking: {value: 0.9" + cited + "}\n";
    std::string leaves = "Si";
};

/// Problems of a chemistry of sputtering with these texts, asked for Si and SiO2 without neutrals.
std::pair<std::string, std::optional<Chemistry>> load_with(const Texts& t) {
    const std::string yield =
        "yield: {angle: {law: flat}, energy: {law: constant, yield: {value: 1" + cited + "}}";
    const std::string text =
        "format: 1\ntitle: t\nions: [Ar+]\nneutrals: [Si, SiO2]\n" +
        (t.section.empty() ? "" : "by_products:\n" + t.section) +
        "materials:\n  Si:\n    processes:\n      - {kind: physical sputtering, on: whole "
        "surface, ions: all, leaves_as: " +
        t.leaves + ", " + yield +
        "}\n  SiO2:\n    processes:\n      - {kind: physical sputtering, on: whole surface, ions: "
        "all, " +
        yield + "}\n";
    const std::string path =
        (std::filesystem::temp_directory_path() / "rille_test_by_products.yaml").string();
    std::ofstream(path) << text;
    Problems problems;
    ChemistryRequest r = request(path, {"SiO2", "Si"});
    r.neutrals.emplace();
    std::optional<Chemistry> found = load_chemistry(r, library(), problems);
    std::filesystem::remove(path);
    std::string report = report_of(problems);
    for (std::size_t at; (at = report.find(path)) != std::string::npos;)
        report.replace(at, path.size(), "f");
    return {report, std::move(found)};
}

std::string problems_with(const std::string& section, const std::string& leaves) {
    return load_with({section, leaves}).first;
}

} // namespace

// Oracle: the mechanism that the text describes. Source: definition. Tolerance: none.
TEST_CASE("by-products are read", "[chemistry][by_products]") {
    const auto [report, chemistry] = load_with({});
    INFO(report);
    REQUIRE(chemistry);
    const fluxes::Mechanism& m = chemistry->mechanism;
    CHECK(m.neutrals == std::vector<std::string>{"Si"}); // the plasma supplies none
    CHECK(m.cosine_power == std::vector<double>{1});
    const auto* own = std::get_if<fluxes::Deposition>(&m.surfaces[1].processes.back());
    REQUIRE(own);
    CHECK(own->coverage == -1);
    CHECK(own->sticking == 0.9);
    CHECK(own->film_material == 1);
    CHECK(m.surfaces[0].coverages == std::vector<std::string>{"redeposited Si"});
    const auto* foreign = std::get_if<fluxes::Redeposition>(&m.surfaces[0].processes.back());
    REQUIRE(foreign);
    CHECK(foreign->film_material == 1);
    CHECK(foreign->film_density == library().material("Si")->density);
    REQUIRE(foreign->removal.size() == 1);
    CHECK(foreign->removal[0].tallies ==
          std::get<fluxes::PhysicalSputtering>(m.surfaces[1].processes.front()).tallies);
    CHECK(foreign->removal[0].leaves.size() == 1);
    CHECK(fluxes::deposited_materials(m) == std::vector<int>{1});
    CHECK(chemistry->standing.at(fluxes::Standing::illustrative) >= 3);
    const auto narrow = load_with({"  Si: {cosine_power: {value: 2" + cited + "}\n", "Si"}).second;
    REQUIRE(narrow);
    CHECK(narrow->mechanism.cosine_power == std::vector<double>{2});
    // Amounts, and what does not stick.
    const auto gas = load_with({"  Si: {}\n", "{Si: {value: 2" + cited + "}"}).second;
    REQUIRE(gas);
    CHECK(std::get<fluxes::PhysicalSputtering>(gas->mechanism.surfaces[1].processes.front())
              .leaves.front()
              .per_unit == 2);
    CHECK(fluxes::deposited_materials(gas->mechanism).empty());
}

// Oracle: a chemistry follows only the by-products of what the case is made of, films included.
// Source: configs/chemistries/argon-milling.yaml. Tolerance: none.
TEST_CASE("by-products come with the materials", "[chemistry][by_products]") {
    const auto neutrals = [](const std::vector<std::string>& materials) {
        ChemistryRequest r = request("argon-milling", materials);
        r.neutrals.emplace();
        Problems problems;
        const auto found = load_chemistry(r, library(), problems);
        INFO(report_of(problems));
        REQUIRE(found);
        return found->mechanism.neutrals;
    };
    CHECK(neutrals({"resist"}).empty());
    CHECK(neutrals({"resist", "Cu"}) == std::vector<std::string>{"Cu"});
    CHECK(neutrals({"W", "Si", "resist"}) == std::vector<std::string>{"Si", "W"});
}

// Oracle: the exact message and place of each fault. Source: the texts. Tolerance: none.
TEST_CASE("faults of by-products are named and placed", "[chemistry][by_products]") {
    const std::string good = Texts{}.section;
    CHECK(problems_with(good, "Si").empty());
    CHECK(
        problems_with(good, "Is") ==
        "f:6:3: by_products.Si: no process gives it off: leaves_as names it nowhere\nf:10:78: "
        "materials.Si.processes[1].leaves_as: \"Is\" is not known here; allowed: Si; did you mean "
        "\"Si\"?");
    CHECK(problems_with("", "Si") ==
          "f:8:78: materials.Si.processes[1].leaves_as: the file has no section by_products that "
          "says what may leave");
    CHECK(problems_with(good + "  Sj: {}\n", "Si")
              .find("f:7:3: by_products.Sj: \"Sj\" is not among the neutrals: Si or SiO2; did you "
                    "mean \"Si\"?") != std::string::npos);
    CHECK(problems_with(good + "  SiO2: {}\n", "Si") ==
          "f:7:3: by_products.SiO2: no process gives it off: leaves_as names it nowhere");
    CHECK(problems_with("  Si: {film: Si}\n", "Si") ==
          "f:6:7: by_products.Si: needs both film and sticking, or neither: what does not stick "
          "builds up no film");
    CHECK(problems_with("  Si: {film: silicon, sticking: {value: 1" + cited + "}\n", "Si")
              .find("by_products.Si.film: \"silicon\" is not known here; allowed: Si or SiO2") !=
          std::string::npos);
    CHECK(problems_with("  Si: {film: Si, sticking: {value: 1.5" + cited + "}\n", "Si")
              .find("by_products.Si.sticking.value: \"1.5\" is out of range") != std::string::npos);
    for (const char* power : {"0.4", "11", "-1"})
        CHECK(problems_with(std::string("  Si: {cosine_power: {value: ") + power + cited + "}\n",
                            "Si")
                  .find("cosine_power.value: \"" + std::string(power) + "\" is out of range") !=
              std::string::npos);
    CHECK(problems_with("  Si: {film: Si, sticking: 1}\n", "Si")
              .find("stands where a cited value is due") != std::string::npos);
    CHECK(problems_with("  Si: {films: Si}\n", "Si").find("films") != std::string::npos);
    CHECK(problems_with(good, "{Si: {value: -1" + cited + "}")
              .find("leaves_as.Si.value: \"-1\" is out of range") != std::string::npos);
    CHECK(problems_with(good, "{Si: {value: 0" + cited + "}").find("is out of range") !=
          std::string::npos);
    CHECK(problems_with(good, "{SI: {value: 1" + cited + "}")
              .find("leaves_as.SI: \"SI\" is not among by_products: Si; did you mean \"Si\"?") !=
          std::string::npos);
    CHECK(problems_with(good, "[Si]").find("leaves_as") != std::string::npos);
}
