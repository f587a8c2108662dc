// SPDX-License-Identifier: Apache-2.0
// The account of what has made a shape, on surfaces that move at known speeds.
#include "engine/causes.hpp"
#include "engine/csv_rows.hpp"
#include "engine/picture.hpp"
#include "engine/shape_ledger.hpp"
#include "engine/shape_output.hpp"
#include "tests/engine/output_samples.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::engine;
using Face = ShapePart::Face;

namespace {

constexpr double wall_speed = 0.02, lean_deg = 5; // [nm/s] along the normal
const double lean = std::tan(lean_deg * 3.14159265358979 / 180);

Case pocket_case() {
    Case c = tests::trench_case();
    c.domain.cells_x = 80;
    c.domain.spacing = 2;
    c.mask.thickness = 0;
    return c;
}

/// A pocket with tapered walls, moved out by `moved` along the normals of the walls, `depth` deep.
geometry::Surface pocket(const geometry::Domain& domain, double moved, double depth) {
    const double side = 0.5 * domain.width_x(), top = 30 + moved * std::sqrt(1 + lean * lean);
    return tests::polyline(domain,
                           {{-side, 0, 0},
                            {-top, 0, 0},
                            {-top + lean * depth, 0, -depth},
                            {top - lean * depth, 0, -depth},
                            {top, 0, 0},
                            {side, 0, 0}},
                           1.3);
}

/// Two causes that share the rate of the walls 3 to 1, and one for the floor.
fluxes::CauseFields causes_on(const geometry::Surface& s, double floor_speed) {
    fluxes::CauseFields cause(fluxes::cause_count, std::vector<double>(s.size(), 0.0));
    for (std::size_t e = 0; e < s.size(); ++e) {
        const bool wall = std::fabs(s.normal[e].x) > 0.7;
        cause[fluxes::enhanced_cause][e] = wall ? 0.75 * wall_speed : floor_speed;
        cause[fluxes::neutral_cause][e] = wall ? 0.25 * wall_speed : 0;
    }
    return cause;
}

/// 40 s on walls that recede while the floor goes down by 1 nm a second.
ShapeLedger forty_seconds(const Case& c) {
    ShapeLedger ledger(c);
    ledger.stand(0, pocket(c.domain, 0, 60));
    fluxes::CauseFields supply(fluxes::ion_paths + 1, std::vector<double>(1000, 0.0));
    for (int step = 0; step < 40; ++step) {
        const auto before = pocket(c.domain, wall_speed * step, 60 + step);
        const auto after = pocket(c.domain, wall_speed * (step + 1), 61 + step);
        ledger.add(1, ledger.read(before, causes_on(before, 1), supply),
                   ledger.read(after, causes_on(after, 1), supply));
        ledger.stand(step + 1, after);
    }
    return ledger;
}

const ShapePart& part_with(const std::vector<ShapePart>& parts, Face face) {
    for (const ShapePart& part : parts)
        if (part.face == face) return part;
    FAIL("no such face");
    return parts.front();
}

} // namespace

// Oracle: a wall that recedes at R along its normal moves sideways at R / cos(lean), shared as the
// rate is; where the floor passes later, for the time since. Source: derived here.
// Tolerance: 1e-9 nm where the wall stood from the start; one step where it came.
TEST_CASE("shape ledger: tapered walls and a floor that move at known speeds", "[causes]") {
    const Case c = pocket_case();
    const ShapeLedger ledger = forty_seconds(c);
    const auto parts = ledger.parts();
    const double sideways = wall_speed * std::sqrt(1 + lean * lean);
    for (const Face face : {Face::left_wall, Face::right_wall}) {
        const ShapePart& wall = part_with(parts, face);
        CHECK(wall.places.size() >= 43); // 100 nm less the foot, 2 nm each
        int from_start = 0, later = 0;
        for (const ShapePart::Place& place : wall.places) {
            CAPTURE(place.at_nm, place.since_s);
            const double time = 40 - place.since_s;
            CHECK(wall.moved_nm(place) == Approx(sideways * time).margin(1e-9));
            CHECK(place.removed[fluxes::enhanced_cause] ==
                  Approx(0.75 * sideways * time).margin(1e-9));
            CHECK(place.removed[fluxes::neutral_cause] ==
                  Approx(0.25 * sideways * time).margin(1e-9));
            CHECK(std::fabs(wall.unexplained_nm(place)) < 1e-9);
            if (place.since_s == 0)
                ++from_start;
            else { // when the wall stood five places further down
                ++later;
                CHECK(std::fabs(60 + place.since_s - (-place.at_nm + 10)) <= 2);
            }
        }
        CHECK(from_start >= 23);
        CHECK(later >= 18);
    }
    const ShapePart& floor = part_with(parts, Face::floor);
    for (const ShapePart::Place& place : floor.places) {
        if (std::fabs(place.at_nm) > 18) continue;
        CHECK(place.since_s == 0);
        CHECK(floor.moved_nm(place) == Approx(40));
        CHECK(place.removed[fluxes::enhanced_cause] == Approx(40));
    }
    CHECK(floor.places.size() >= 18);
}

// Oracle: a wall whose rates miss a tenth of what moves it. Source: derived here. Tolerance: 1e-9.
TEST_CASE("shape ledger: what no cause explains is told", "[causes]") {
    const Case c = pocket_case();
    ShapeLedger ledger(c);
    const auto before = pocket(c.domain, 0, 60), after = pocket(c.domain, 1.1 * wall_speed, 60);
    ledger.stand(0, before);
    const fluxes::CauseFields none;
    ledger.add(1, ledger.read(before, causes_on(before, 1), none),
               ledger.read(after, causes_on(after, 1), none));
    ledger.stand(1, after);
    const ShapePart wall = part_with(ledger.parts(), Face::left_wall);
    for (const ShapePart::Place& place : wall.places)
        CHECK(wall.unexplained_nm(place) ==
              Approx(0.1 * wall_speed * std::sqrt(1 + lean * lean)).margin(1e-9));
}

// Oracle: the wall of a round hole in r and z, moved out by half a nanometre.
// Source: derived here. Tolerance: 1e-6 nm.
TEST_CASE("shape ledger: round holes have one wall", "[causes]") {
    Case c = pocket_case();
    c.domain.symmetry = geometry::Symmetry::revolved;
    c.mask.openings.front().shape = geometry::Opening::Shape::round;
    c.mask.openings.front().width_y = c.mask.openings.front().width_x;
    const auto hole = [&](double radius) {
        return tests::polyline(c.domain,
                               {{0, 0, -60}, {radius, 0, -60}, {radius, 0, 0}, {160, 0, 0}}, 1.3);
    };
    ShapeLedger ledger(c);
    const auto before = hole(30), after = hole(30.5);
    ledger.stand(0, before);
    fluxes::CauseFields cause(fluxes::cause_count, std::vector<double>(before.size(), 0.0));
    cause[fluxes::neutral_cause].assign(before.size(), 0.5);
    ledger.add(1, ledger.read(before, cause, {}), ledger.read(before, cause, {}));
    ledger.stand(1, after);
    const auto parts = ledger.parts();
    REQUIRE(parts.size() == 2);
    const ShapePart& wall = part_with(parts, Face::wall);
    CHECK(wall.places.size() >= 24);
    for (const ShapePart::Place& place : wall.places) {
        CHECK(wall.moved_nm(place) == Approx(0.5).margin(1e-6));
        CHECK(std::fabs(wall.unexplained_nm(place)) < 1e-6);
    }
}

TEST_CASE("shape ledger: the table adds up, and the picture names what counts", "[causes]") {
    const Case c = pocket_case();
    const auto parts = forty_seconds(c).parts();
    const std::string text = causes_csv(c, parts);
    CHECK(text.find("verify on wafers") != std::string::npos);
    const CsvRows csv = split_csv(text, "causes.csv");
    const CsvRow& names = csv.rows[0];
    const auto column = [&](const std::string& name) {
        for (std::size_t i = 0; i < names.size(); ++i)
            if (names[i].text == name) return i;
        FAIL("no column " << name);
        return std::size_t(0);
    };
    const std::size_t first = column("ion_enhanced_direct_ions_nm"),
                      last = column("unexplained_nm"), moved = column("moved_nm");
    CHECK(last == first + fluxes::cause_count);
    CHECK(names.back().text == "supply_Cl_nm");
    for (std::size_t r = 1; r < csv.rows.size(); ++r) {
        double sum = 0;
        for (std::size_t i = first; i <= last; ++i)
            sum += std::stod(csv.rows[r][i].text);
        CHECK(sum == Approx(std::stod(csv.rows[r][moved].text)).margin(1e-9));
    }
    SurfaceState state = tests::trench_state(c, 1, 75);
    const std::string svg = cause_picture_svg(c, state, parts);
    for (const char* word :
         {"Left wall", "Right wall", "Floor", "direct ions", "neutrals without ions",
          "way of the surface itself", "not a released recipe", "illustrative"})
        CHECK(svg.find(word) != std::string::npos);
    CHECK(svg.find("fast neutrals") == std::string::npos); // there are none
    CHECK(png_of(svg, 1).size() > 10000);
}
