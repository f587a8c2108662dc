// SPDX-License-Identifier: Apache-2.0
// Tables and pictures of what made a shape, from invented amounts.
#include "engine/cause_bands.hpp"
#include "engine/cause_output.hpp"
#include "engine/causes.hpp"
#include "engine/csv_rows.hpp"
#include "engine/output_folder.hpp"
#include "engine/palette.hpp"
#include "engine/picture.hpp"
#include "geometry/check.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>

using namespace rille;
using namespace rille::engine;

TEST_CASE("causes: the table holds every piece, and its totals add up", "[causes]") {
    // Oracle: the amounts of the sample. Source: definition. Tolerance: 1e-12 relative.
    const Case c = tests::trench_case();
    const SurfaceState state = tests::trench_state(c, 1, 75);
    const std::string text = causes_csv(c, state);
    CHECK(text.find("verify on wafers") != std::string::npos);
    const CsvRows csv = split_csv(text, "causes.csv");
    REQUIRE(csv.rows.size() == state.surface.size() + 1);
    const CsvRow& names = csv.rows[0];
    const auto column = [&](const std::string& name) {
        for (std::size_t i = 0; i < names.size(); ++i)
            if (names[i].text == name) return i;
        FAIL("no column " << name);
        return std::size_t(0);
    };
    const std::size_t first = column("ion_enhanced_direct_ions_nm"), total = column("total_nm"),
                      region = column("region");
    CHECK(total == first + fluxes::cause_count + 1);
    CHECK(names.back().text == "supply_Cl_nm");
    std::vector<std::string> met;
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        double sum = 0;
        for (std::size_t i = first; i < total; ++i)
            sum += std::stod(csv.rows[r][i].text);
        CHECK(sum == Approx(std::stod(csv.rows[r][total].text)).epsilon(1e-12));
        met.push_back(csv.rows[r][region].text);
    }
    for (const char* expected : {"top", "left wall", "floor", "right wall"})
        CHECK(std::find(met.begin(), met.end(), expected) != met.end());
    // Walking from -x to +x: the left wall comes before the floor, the right wall after it.
    const auto at = [&](const char* name) { return std::find(met.begin(), met.end(), name); };
    CHECK(at("top") < at("left wall"));
    CHECK(at("left wall") < at("floor"));
    CHECK(at("floor") < at("right wall"));
    SurfaceState without = state;
    without.removed.clear();
    CHECK_THROWS_AS(causes_csv(c, without), InternalError);
}

TEST_CASE("causes: the picture shows what counts and names it", "[causes]") {
    const Case c = tests::trench_case();
    const std::string svg = cause_picture_svg(c, tests::trench_state(c, 1, 75));
    for (const char* word :
         {"Left wall", "Right wall", "Floor", "direct ions", "ions after 1 bounce",
          "sputtered by direct ions", "neutrals without ions", "deposition (less)",
          "not a released recipe", "illustrative"})
        CHECK(svg.find(word) != std::string::npos);
    CHECK(svg.find("fast neutrals") == std::string::npos); // there are none
    CHECK(png_of(svg, 1).size() > 10000);
}

TEST_CASE("causes: bands keep their distance in lightness", "[causes]") {
    // Oracle: neighbours in a stack differ by at least 15 in lightness or are hatched apart.
    // Source: common practice, no source. Tolerance: none.
    const auto& looks = cause_looks();
    for (std::size_t k = 0; k + 1 < looks.size(); ++k) {
        INFO(looks[k].column);
        CHECK((std::fabs(lightness(looks[k].colour) - lightness(looks[k + 1].colour)) > 15 ||
               looks[k].hatched != looks[k + 1].hatched));
    }
}

TEST_CASE("causes: axes have round ticks", "[causes]") {
    const AxisScale plain{-1.5, 12, false};
    CHECK(plain.ticks(4) == std::vector<double>{0, 5, 10});
    CHECK(plain.part(12) == Approx(1));
    const AxisScale decades{1e-3, 2, true};
    CHECK(decades.ticks(4).size() == 4);
    CHECK(decades.part(1e-9) == Approx(0));
}
