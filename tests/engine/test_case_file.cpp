// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"

#include <catch2/catch.hpp>

#include <fstream>
#include <sstream>

using namespace rille::engine;
namespace geometry = rille::geometry;

namespace {

const std::string trench = std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml";
const std::string via = std::string(RILLE_ROOT) + "/examples/contact-via/case.yaml";

std::string read(const std::string& path) {
    std::ostringstream text;
    text << std::ifstream(path).rdbuf();
    return text.str();
}

std::string report_of(const std::string& path, const std::vector<std::string>& overrides) {
    try {
        load_case(path, overrides);
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

/// The text with the first `old` replaced.
std::string with(std::string text, const std::string& old, const std::string& now) {
    const std::size_t at = text.find(old);
    REQUIRE(at != std::string::npos);
    return text.replace(at, old.size(), now);
}

} // namespace

TEST_CASE("the trench example is read into inside units") {
    const Case c = load_case(trench);
    CHECK(c.title == "60 nm gate trench, chlorine main etch and overetch");
    CHECK(c.domain.extruded());
    CHECK(c.domain.cells_x == 80);
    CHECK(c.domain.cells_y == 1);
    CHECK(c.domain.spacing == 2);
    REQUIRE(c.films.size() == 4);
    CHECK(c.films[0].name == "mask");
    CHECK(c.films[0].top == 180);
    CHECK(c.films[1].bottom == -240);
    CHECK(c.films[2].bottom == -252);
    CHECK(std::isinf(c.films[3].bottom));
    CHECK(c.substrate_first == 1);
    CHECK(c.materials[c.films[1].material] == "Si");
    CHECK(c.films[1].material == c.films[3].material);
    CHECK(c.mask.openings.at(0).width_x == 60);
    CHECK(c.mask.sidewall_angle_deg == 88);
    const Plasma& plasma = c.plasmas.at("main");
    CHECK(plasma.ion_flux == Approx(1.1 * 62.41509).epsilon(1e-6));
    CHECK(plasma.ions.at(0).name == "Cl2+");
    CHECK(plasma.ions.at(0).share == Approx(0.7));
    CHECK(plasma.neutrals.at(0).flux == Approx(3e4));
    CHECK(plasma.bias.value == 115);
    CHECK(plasma.unused == std::vector<std::string>{"source_power: 500 W"});
    CHECK(c.wafer_temperature_k == Approx(323.15));
    REQUIRE(c.steps.size() == 2);
    CHECK(c.steps[0].end.kind == StepEnd::Kind::reaches);
    CHECK(c.steps[0].end.film == "stop");
    CHECK(c.steps[0].end.at == "trench");
    CHECK(c.steps[0].no_longer_than_s == 150);
    CHECK_FALSE(c.steps[0].must_end);
    CHECK(c.steps[1].end.kind == StepEnd::Kind::share_of_step);
    CHECK(c.steps[1].end.share == Approx(0.3));
    CHECK(c.cd_places.at("top").z == -10);
    CHECK(c.cd_places.at("middle").z == -120);
    CHECK(c.cd_places.at("bottom").z == -230);
    REQUIRE(c.targets.size() == 3);
    CHECK(c.targets[0].at_least == 50);
    CHECK(c.targets[0].at_most == 65);
    CHECK_FALSE(c.targets[1].at_least.has_value());
    CHECK(c.targets[2].at_least == 40);
}

TEST_CASE("a target may hold at the end of a step") {
    const Case c = load_case(trench, {"targets={mask left: {at_least: 40 nm, after: main}, bottom "
                                      "cd: {at_least: 50 nm, at_most: 65 nm}, bow: at most 4 nm}"});
    REQUIRE(c.targets.size() == 3);
    CHECK(c.targets[0].after == "main");
    CHECK(c.targets[0].at_least == 40);
    CHECK_FALSE(c.targets[0].at_most.has_value());
    CHECK(c.targets[0].text == "at least 40 nm");
    CHECK(c.targets[1].after.empty());
    CHECK(c.targets[1].at_most == 65);
    CHECK(c.targets[1].text == "50 nm to 65 nm");
    const Case again = parse_case(c.resolved_yaml, "resolved.yaml", "/nowhere");
    CHECK(again.targets[0].after == "main");
    CHECK(again.resolved_yaml == c.resolved_yaml);
}

TEST_CASE("the via example is read too") {
    const Case c = load_case(via);
    CHECK(c.domain.symmetry == geometry::Symmetry::full);
    CHECK(c.domain.cells_x == 24);
    CHECK(c.domain.cells_y == 24);
    CHECK(c.mask.openings.at(0).shape == geometry::Opening::Shape::round);
    CHECK(c.mask.openings.at(0).width_y == 56);
    CHECK(c.tool_log.size() == 3);
    CHECK(c.plasmas.at("main").unused.empty()); // gas and pressure: collisions in the sheath
}

TEST_CASE("the resolved case holds every default and reads back as the same case") {
    for (const std::string& file : {trench, via}) {
        const Case first = load_case(file);
        const Case second = parse_case(first.resolved_yaml, "resolved.yaml", "/nowhere");
        CHECK(first.resolved_yaml == second.resolved_yaml);
        CHECK(second.domain.spacing == first.domain.spacing);
        CHECK(second.films.size() == first.films.size());
        CHECK(second.targets.size() == first.targets.size());
        CHECK(second.steps.size() == first.steps.size());
        CHECK(second.plasmas.at("main").ion_flux == first.plasmas.at("main").ion_flux);
        for (const char* key : {"rays_per_point: 64", "seed: 1", "must_end: false", "centre: 0 nm"})
            CHECK(first.resolved_yaml.find(key) != std::string::npos);
    }
}

TEST_CASE("without places of its own a case gets three, and they stand in the resolved case") {
    std::string text = read(trench);
    text = with(text,
                "measure:\n  cd: {top: 10 nm below gate top, middle: middle of gate, "
                "bottom: 10 nm above stop}\n",
                "");
    const Case c = parse_case(text, "case.yaml", ".");
    CHECK(c.cd_places.at("bottom").z == -230);
    CHECK(c.resolved_yaml.find("top: 10 nm below gate top") != std::string::npos);
    CHECK(parse_case(c.resolved_yaml, "r.yaml", ".").resolved_yaml == c.resolved_yaml);
}

TEST_CASE("overrides address items of lists by name") {
    const Case c =
        load_case(trench, {"mask.openings.trench.cd=50 nm", "stack.gate.thickness=200 nm",
                           "plasmas.main.ions={Ar+: 100 %}", "sampling.seed=7",
                           "recipe.steps.over.time=10 s"});
    CHECK(c.mask.openings.at(0).width_x == 50);
    CHECK(c.films[1].bottom == -200);
    CHECK(c.plasmas.at("main").ions.size() == 1);
    CHECK(c.seed == 7);
    CHECK(c.steps[1].end.time_s == 10);
    CHECK(c.resolved_yaml.find("cd: 50 nm") != std::string::npos);
}

TEST_CASE("overrides that fit nothing are input errors") {
    CHECK(report_of(trench, {"mask.openings.trench.cd=60"}) ==
          "--set mask.openings.trench.cd=60: mask.openings.trench.cd: \"60\" has no unit; a length "
          "is due, for example 60 nm (nm, um, angstrom or mm)");
    CHECK(report_of(trench, {"mask.openings.trnch.cd=60 nm"}) ==
          "--set mask.openings.trnch.cd=60 nm: mask.openings.trnch.cd: nothing is called \"trnch\" "
          "there; did you mean \"trench\"?");
    CHECK(report_of(trench, {"mask.thicknes=60 nm"}) ==
          "--set mask.thicknes=60 nm: mask.thicknes: unknown key; did you mean \"thickness\"?");
    CHECK(report_of(trench, {"pitch"}) ==
          "--set pitch: key.path=value is due, for example mask.thickness=\"150 nm\"");
}

TEST_CASE("spacing is rounded so that whole cells fill the pitch") {
    const Case c = load_case(trench, {"spacing=1.9 nm"});
    CHECK(c.domain.cells_x == 84);
    CHECK(c.domain.spacing == Approx(160.0 / 84).epsilon(1e-15));
    CHECK(c.spacing_asked == 1.9);
    CHECK_FALSE(c.warnings.empty());
    const Case oblong = load_case(via, {"pitch=[96 nm, 120 nm]", "spacing=5 nm"});
    CHECK(oblong.domain.width_x() == Approx(96));
    CHECK(oblong.domain.width_y() == Approx(120));
    CHECK(report_of(via, {"pitch=[96 nm, 101.7 nm]"}).find("has no common spacing") !=
          std::string::npos);
}

TEST_CASE("films repeat, with numbered names") {
    const std::string text =
        with(read(trench), "  - {name: stop, material: SiO2, thickness: 12 nm}\n",
             "  - name: pair\n    repeat: 64\n    films:\n"
             "      - {name: oxide, material: SiO2, thickness: 20 nm}\n"
             "      - {name: nitride, material: Si3N4, thickness: 25 nm}\n"
             "  - {name: stop, material: SiO2, thickness: 12 nm}\n");
    const Case c = parse_case(text, "case.yaml", ".",
                              {"measure={cd: {a: middle of pair 1 nitride}}", "targets={}"});
    REQUIRE(c.films.size() == 4 + 128);
    CHECK(c.films[2].name == "pair 1 oxide");
    CHECK(c.films[3].name == "pair 1 nitride");
    CHECK(c.films[129].name == "pair 64 nitride");
    CHECK(c.films[129].bottom == Approx(-240 - 64 * 45));
    CHECK(c.cd_places.at("a").z == Approx(-240 - 32.5));
    CHECK(parse_case(c.resolved_yaml, "r.yaml", ".").films.size() == c.films.size());
}

TEST_CASE("a thousand repeats are read") {
    const std::string text =
        with(read(trench), "  - {name: stop, material: SiO2, thickness: 12 nm}\n",
             "  - {repeat: 1000, films: [{name: a, material: SiO2, thickness: 20 nm}, "
             "{name: b, material: Si, thickness: 2 nm}]}\n"
             "  - {name: stop, material: SiO2, thickness: 12 nm}\n");
    const Case c = parse_case(text, "case.yaml", ".");
    CHECK(c.films.size() == 2004);
}

TEST_CASE("line arrays become single openings; cd may be given at the mask top") {
    const std::string text =
        with(read(trench), "{name: trench, shape: trench, cd: 60 nm, cd_at: mask bottom}",
             "{name: trench, shape: lines, cd: 30 nm, space: 20 nm, count: 3}");
    const Case c = parse_case(text, "case.yaml", ".");
    REQUIRE(c.mask.openings.size() == 3);
    CHECK(c.mask.openings[0].name == "trench 1");
    CHECK(c.mask.openings[0].centre_x == -50);
    CHECK(c.mask.openings[2].centre_x == 50);
    CHECK(c.steps[0].end.at == "trench 2"); // the middle one
    const Case top = load_case(trench, {"mask.openings.trench.cd_at=mask top"});
    CHECK(top.mask.openings[0].width_x ==
          Approx(60 - 2 * 180 / std::tan(88 * std::acos(-1.0) / 180)).epsilon(1e-12));
}

TEST_CASE("a plasma copies another; what is given replaces") {
    const std::string text =
        with(read(trench), "chemistry:",
             "  soft: {from: main, gas_temperature: 320 K, rf_bias: {mean_sheath: 40 V}, "
             "neutrals: {Cl: {flux: 1e18 /cm2/s}}}\nchemistry:");
    const Case c = parse_case(text, "case.yaml", ".");
    const Plasma& soft = c.plasmas.at("soft");
    CHECK(soft.bias.value == 40);
    CHECK(soft.neutrals.at(0).flux == Approx(1e4));
    CHECK(soft.neutrals.at(0).temperature_k == 320); // the whole key is replaced
    CHECK(soft.ion_flux == c.plasmas.at("main").ion_flux);
    CHECK(c.resolved_yaml.find("from:") == std::string::npos);
}

TEST_CASE("a wrong value in a copied plasma is reported once") {
    const std::string text = with(
        with(read(trench), "chemistry:", "  soft: {from: main}\nchemistry:"), "1.1 mA/cm2", "1.1");
    try {
        parse_case(text, "case.yaml", ".");
        FAIL("accepted");
    } catch (const InputError& error) {
        CHECK(error.problems().size() == 1);
    }
}
