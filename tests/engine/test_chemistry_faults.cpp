// SPDX-License-Identifier: Apache-2.0
#include "fluxes/surface_chemistry.hpp"
#include "tests/support/chemistry_files.hpp"

#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>
#include <optional>
#include <string>
#include <utility>
#include <vector>

using namespace rille::engine;
namespace fluxes = rille::fluxes;

namespace {

/// The problems of a chemistry file with this text, asked for Si with every species, and the
/// chemistry if there are none.
std::pair<std::string, std::optional<Chemistry>> load_text(const std::string& text) {
    const std::string path =
        (std::filesystem::temp_directory_path() / "rille_test_chemistry.yaml").string();
    std::ofstream(path) << text;
    Problems problems;
    std::optional<Chemistry> found = load_chemistry(request(path, {"Si"}), library(), problems);
    std::filesystem::remove(path);
    std::string report = report_of(problems);
    for (std::size_t at; (at = report.find(path)) != std::string::npos;)
        report.replace(at, path.size(), "f");
    return {report, std::move(found)};
}

std::string problems_of(const std::string& text) {
    return load_text(text).first;
}

std::string file_with(const std::string& process) {
    return "format: 1\ntitle: t\nions: [Ar+]\nneutrals: [Cl]\nmaterials:\n  Si:\n"
           "    adsorbates: [Cl]\n    processes:\n      - " +
           process + "\n";
}

const std::string cited = ", standing: illustrative, source: s}";

} // namespace

// Oracle: the exact message and place of each fault. Source: the texts below. Tolerance: none.
TEST_CASE("faults of chemistry files are named and placed", "[chemistry]") {
    const std::string good = "{kind: adsorption, neutral: Cl, adsorbate: Cl, sticking: {value: 0.3";
    CHECK(problems_of(file_with(good + cited + "}")).empty());
    CHECK(problems_of(file_with("{kind: adsorbtion}")) ==
          "f:9:16: materials.Si.processes[1].kind: \"adsorbtion\" is not known here; allowed: "
          "adsorption, ion adsorption, desorption, recombination, ion-enhanced etching, physical "
          "sputtering, spontaneous etching, thermal etching, ion removal, neutral removal or "
          "deposition; did you mean \"adsorption\"?");
    CHECK(
        problems_of(file_with(good + ", standing: guessed, source: s}}"))
            .find("sticking.standing: \"guessed\" is not known here; allowed: measured, published, "
                  "from memory or illustrative") != std::string::npos);
    CHECK(problems_of(file_with(good + ", standing: measured}}"))
              .find("sticking: the key \"source\" is missing") != std::string::npos);
    CHECK(problems_of(file_with("{kind: adsorption, neutral: Cl, adsorbate: Cl, sticking: 0.3}")) ==
          "f:9:66: materials.Si.processes[1].sticking: \"0.3\" stands where a cited value is due, "
          "for example {value: 0.5, standing: published, source: \"...\"}");
    CHECK(problems_of(file_with("{kind: adsorption, neutral: Cl, adsorbate: Cl, sticking: {value: "
                                "1.3" +
                                cited + "}"))
              .find("\"1.3\" is out of range") != std::string::npos);
    const std::string bare = "{kind: physical sputtering, on: bare sites, ions: all, yield: "
                             "{angle: {law: flat}, energy: ";
    const auto threshold = [&](const std::string& value) {
        return problems_of(file_with(bare + "{law: square root, threshold: {value: " + value +
                                     cited + ", amplitude: {value: 0.5 /sqrt(eV)" + cited + "}}}"));
    };
    CHECK(threshold("16 eV").empty());
    CHECK(threshold("16").find("\"16\" has no unit; an energy is due") != std::string::npos);
    CHECK(threshold("16 V").find("is a voltage: write eV") != std::string::npos);
    CHECK(problems_of(file_with(bare + "{law: square root, threshold: {value: 16 eV" + cited +
                                ", amplitude: {value: 0.5" + cited + "}}}"))
              .find("\"0.5\"; a number in /sqrt(eV) is due, for example 0.5 /sqrt(eV)") !=
          std::string::npos);
    CHECK(problems_of(file_with(bare + "{law: square root, threshold: {value: 16 eV" + cited +
                                ", through: {value: 1, at: 10 eV" + cited + "}}}"))
              .find("not above the threshold") != std::string::npos);
    CHECK(
        problems_of(file_with("{kind: physical sputtering, on: bare sites, ions: [Ar], yield: "
                              "{angle: {law: flat}, energy: {law: constant, yield: {value: 1" +
                              cited + "}}}"))
            .find("\"Ar\" is not among the ions of this chemistry (Ar+); did you mean \"Ar+\"?") !=
        std::string::npos);
    CHECK(problems_of(file_with(good + cited +
                                "}\n      - {kind: recombination, neutral: Cl, on: "
                                "whole surface, probability: {value: 0.8" +
                                cited + "}")) ==
          "f:7:5: materials.Si: the probabilities of Cl on bare sites add up to 1.1 at 300 K, more "
          "than 1");
    CHECK(
        problems_of("format: 1\ntitle: t\nions: [Arr+]\nneutrals: []\nmaterials: {Si: {processes: "
                    "[]}}\n") ==
        "f:3:8: ions[1]: \"Arr+\" is not in configs/ions.yaml; did you mean \"Ar+\"?");
    CHECK(problems_of("format: 2\ntitle: t\nions: []\nneutrals: []\nmaterials: {Si: {processes: "
                      "[]}}\n") ==
          "f:1:9: format: \"2\" is out of range; allowed is at least 1 and at most 1");
    // Materials that the case does not use are checked too.
    CHECK_FALSE(problems_of("format: 1\ntitle: t\nions: []\nneutrals: []\nmaterials: {Si: "
                            "{processes: []}, W: {proceses: []}}\n")
                    .empty());
}

// Oracle: the exact message. Source: the texts below. Tolerance: none.
TEST_CASE("what a chemistry does not know is an error of the case", "[chemistry]") {
    Problems problems;
    ChemistryRequest r = request("argon-milling", {"Si", "resit"});
    r.ions = uses({"Xe+"});
    CHECK_FALSE(load_chemistry(r, library(), problems));
    CHECK(
        report_of(problems) ==
        "case.yaml:10:5: stack.Xe+: the chemistry argon-milling does not know the ion \"Xe+\"; it "
        "knows Ar+\n"
        "case.yaml:11:5: stack.resit: the chemistry argon-milling does not know the material "
        "\"resit\"; it knows Si, SiO2, Si3N4, resist, amorphous carbon, W, Al or Cu; did you mean "
        "\"resist\"?");
    Problems unknown;
    CHECK_FALSE(load_chemistry(request("silicon-cl2", {"Si"}), library(), unknown));
    CHECK(report_of(unknown) ==
          "case.yaml:3:12: chemistry: there is no chemistry \"silicon-cl2\"; known: argon-milling, "
          "oxide-c4f8-ar-o2, silicon-cl2-ar or silicon-sf6-o2, or the path of a file; did you mean "
          "\"silicon-cl2-ar\"?");
    Problems missing;
    CHECK_FALSE(load_chemistry(request("./none.yaml", {"Si"}), library(), missing));
    CHECK(report_of(missing) == "case.yaml:3:12: chemistry: there is no file ././none.yaml");
}

// Oracle: the numbers written, in inside units. Source: the text below. Tolerance: round-off.
TEST_CASE("every kind of process is read", "[chemistry]") {
    const auto cite = [](const std::string& value) {
        return "{value: " + value + ", standing: measured, source: s}";
    };
    const std::string text =
        "format: 1\ntitle: t\nions: [Ar+, Cl2+]\nneutrals: [Cl, CF2]\nyields:\n"
        "  shared: {energy: {law: square root, threshold: " +
        cite("16 eV") + ", amplitude: " + cite("0.5 /sqrt(eV)") +
        "}, angle: {law: plateau then line, plateau: " + cite("60 deg") +
        "}}\nmaterials:\n  Si:\n    adsorbates: [Cl, P]\n"
        "    ion_reflection: {critical_angle: " +
        cite("70 deg") +
        "}\n    processes:\n"
        "      - {kind: adsorption, neutral: Cl, adsorbate: Cl, sticking: " +
        cite("0.3") + ", atoms: " + cite("2") +
        ", ion_assistance: {doubles_at: " + cite("1e15 /cm2/s") +
        ", ions: [Ar+]}}\n"
        "      - {kind: ion adsorption, adsorbate: Cl, sticking: " +
        cite("0.8") + ", ions: {Cl2+: {times: " + cite("2") +
        "}}}\n"
        "      - {kind: desorption, adsorbate: Cl, frequency: {value: 1e13 Hz, activation: 1.8 eV, "
        "standing: measured, source: s}, sites: " +
        cite("6.78e14 /cm2") +
        "}\n"
        "      - {kind: recombination, neutral: Cl, on: sites of P, probability: " +
        cite("0.1") +
        "}\n      - {kind: ion-enhanced etching, adsorbate: Cl, atoms_per_unit: " + cite("4") +
        ", yield: shared, ions: {Cl2+: {atoms: " + cite("2") +
        "}, Ar+: {}}}\n"
        "      - {kind: physical sputtering, on: bare sites, ions: [Ar+], yield: {energy: {law: "
        "bohdansky, projectile: Ar, target: Si, q: " +
        cite("3.874") + "}, angle: {law: peaked, exponent: " + cite("2") +
        ", peak: " + cite("65 deg") +
        "}}}\n"
        "      - {kind: spontaneous etching, neutral: Cl, on: whole surface, probability: {value: "
        "1e-5, at: 298.15 K, activation: 0.29 eV, standing: measured, source: s}, "
        "atoms_per_unit: " +
        cite("4") +
        "}\n      - {kind: thermal etching, adsorbate: Cl, flux: " + cite("5e16 /cm2/s") +
        ", atoms_per_unit: " + cite("4") +
        "}\n"
        "      - {kind: ion removal, adsorbate: P, yield: shared, ions: all}\n"
        "      - {kind: neutral removal, adsorbate: P, neutral: Cl, probability: " +
        cite("0.01") +
        "}\n      - {kind: adsorption, neutral: CF2, adsorbate: P, sticking: " + cite("0.2") +
        "}\n      - {kind: deposition, neutral: CF2, adsorbate: P, film: fluorocarbon polymer, "
        "sticking: " +
        cite("0.05") +
        "}\n"
        "  fluorocarbon polymer:\n    processes:\n      - {kind: deposition, neutral: CF2, on: "
        "whole surface, film: fluorocarbon polymer, sticking: " +
        cite("0.05") + "}\n";
    const auto [report, chemistry] = load_text(text);
    CHECK(report.empty());
    REQUIRE(chemistry);
    const Chemistry& c = *chemistry;
    REQUIRE(c.materials == std::vector<std::string>{"Si", "fluorocarbon polymer"});
    CHECK(c.reflection[0].critical_deg == 70);
    CHECK(c.reflection[1].critical_deg == 60);
    const auto& p = c.mechanism.surfaces[0].processes;
    REQUIRE(p.size() == 12);
    const auto& adsorption = std::get<fluxes::Adsorption>(p[0]);
    CHECK(adsorption.sticking == 0.3);
    CHECK(adsorption.atoms == 2);
    CHECK(adsorption.assistance.eta == Approx(0.1).epsilon(1e-14)); // 1e15 /cm2/s = 10 /nm2/s
    const auto yield = [&](int tally, double energy) {
        return c.mechanism.tallies[tally].yield(energy, 1);
    };
    CHECK(yield(std::get<fluxes::IonAdsorption>(p[1]).tallies.at(0), 300) == Approx(1.6));
    const fluxes::Arrhenius leaving = std::get<fluxes::Desorption>(p[2]).flux;
    CHECK(leaving.value == Approx(6.78e13).epsilon(1e-14));
    CHECK(leaving.activation_ev == 1.8);
    const auto& recombination = std::get<fluxes::Recombination>(p[3]);
    CHECK(recombination.on.kind == fluxes::SurfacePart::Kind::covered);
    CHECK(recombination.on.coverage == 1);
    const auto& enhanced = std::get<fluxes::IonEnhancedEtching>(p[4]);
    REQUIRE(enhanced.tallies.size() == 2);
    CHECK(yield(enhanced.tallies[0], 200) == Approx(6).epsilon(1e-12)); // 2 x 0.5 (10 - 4)
    CHECK(yield(enhanced.tallies[1], 100) == Approx(3).epsilon(1e-12));
    CHECK(yield(std::get<fluxes::PhysicalSputtering>(p[5]).tallies.at(0), 500) ==
          Approx(0.506).epsilon(3e-4));
    CHECK(std::get<fluxes::SpontaneousEtching>(p[6]).probability.at(298.15) ==
          Approx(1e-5).epsilon(1e-12));
    CHECK(std::get<fluxes::ThermalEtching>(p[7]).flux.value == Approx(500).epsilon(1e-14));
    // The same yield of the same ion is the same tally.
    const auto& removal = std::get<fluxes::IonRemoval>(p[8]);
    CHECK(removal.tallies.at(0) == enhanced.tallies[1]);
    CHECK(std::get<fluxes::NeutralRemoval>(p[9]).probability.value == 0.01);
    const auto& deposition = std::get<fluxes::Deposition>(p[11]);
    CHECK(deposition.film_material == 1);
    CHECK(deposition.film_density == Approx(24.1).epsilon(1e-14));
    CHECK(std::get<fluxes::Deposition>(c.mechanism.surfaces[1].processes.at(0)).coverage == -1);
    CHECK(c.standing.at(fluxes::Standing::measured) > 20);
}
