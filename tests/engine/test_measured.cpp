// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/comparison.hpp"
#include "engine/metrics.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

using namespace rille;
using namespace rille::engine;
using tests::Vec3;

namespace {

/// A trench with upright walls 30 nm from the axis and a flat floor 200 nm deep.
SurfaceState box_trench(const Case& c) {
    SurfaceState state;
    state.surface = tests::polyline(
        c.domain,
        {{-80, 0, 180}, {-30, 0, 180}, {-30, 0, -200}, {30, 0, -200}, {30, 0, 180}, {80, 0, 180}},
        1.0);
    return state;
}

MeasuredContour contour(std::vector<std::array<double, 2>> points) {
    MeasuredContour result;
    result.feature = "trench";
    result.points = std::move(points);
    return result;
}

std::string problems_of(const std::string& text, const ContourFrame& frame) {
    Problems problems;
    parse_contour(text, "section.csv", frame, problems);
    try {
        problems.throw_if_any();
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

} // namespace

TEST_CASE("measured contour: pixels become nm about the origin, y down, turned", "[measured]") {
    // Oracle: a point 100 px right of the origin and 50 px above it, at 0.5 nm/px.
    // Source: derived here. Tolerance: round-off.
    Problems problems;
    ContourFrame frame;
    frame.nm_per_px = 0.5;
    frame.origin = {500, 300};
    frame.axis_x = 7;
    const std::string text = "# source=test\nx_px,y_px\n600,250\n500,300\n";
    auto points = parse_contour(text, "a.csv", frame, problems);
    REQUIRE(problems.empty());
    CHECK(points[0][0] == Approx(57));
    CHECK(points[0][1] == Approx(25));
    CHECK(points[1][0] == Approx(7));
    frame.rotation_deg = 90; // anticlockwise: right becomes up
    points = parse_contour(text, "a.csv", frame, problems);
    CHECK(points[0][0] == Approx(7 - 25));
    CHECK(points[0][1] == Approx(50));
}

TEST_CASE("measured contour: what is wrong with the file is said with its place", "[measured]") {
    ContourFrame nm, px;
    px.nm_per_px = 1;
    CHECK(problems_of("x_px,y_px\n1,2\n3,4\n", nm) ==
          "section.csv:1:1: the points are in pixels: measured.scale is due, for example 0.82 "
          "nm/px");
    CHECK(problems_of("x_nm,z_nm\n1,2\n3,4\n", px) ==
          "section.csv:1:1: the points are in nm: leave measured.scale out");
    CHECK(problems_of("x_nm,z_nm\n1,2\n3,wide\n", nm).find("section.csv:3:3: ") == 0);
    CHECK(problems_of("x_nm,z_nm\n1,2\n", nm) == "section.csv: holds fewer than two points");
    CHECK(problems_of("x_nm,z_nm\n1,2\n3,4\n", nm).empty());
}

TEST_CASE("measured contour: distances and widths against closed forms", "[measured]") {
    // Oracle: walls 32 and 27 nm from the axis beside walls at 30 nm: distances 2 and 3 nm, so that
    // the root mean square is sqrt((4 + 9) / 2); predicted less measured width 60 - 59 nm.
    // Source: derived here. Tolerance: 1e-9 nm.
    Case c = tests::trench_case();
    c.measured.contour = contour({{-32, -20}, {-32, -120}, {-32, -120}, {27, -120}, {27, -20}});
    c.measured.contour->points = {{-32, -20}, {-32, -120}};
    const SurfaceState state = box_trench(c);
    CHECK(compare_measured(c, state).contours[0].rms_nm == Approx(2).margin(1e-9));
    CHECK_FALSE(compare_measured(c, state).contours[0].rms_nm == Approx(2.04).margin(1e-9));
    c.measured.contour->points = {{27, -20}, {27, -120}};
    const ContourComparison right = compare_measured(c, state).contours[0];
    CHECK(right.rms_nm == Approx(3).margin(1e-9));
    CHECK(right.largest_nm == Approx(3).margin(1e-9));

    // Both walls joined far below the front, where no height is looked at twice.
    c.measured.contour->points = {{-32, -20}, {-32, -190}, {27, -190}, {27, -20}};
    const ContourComparison both = compare_measured(c, state).contours[0];
    REQUIRE(both.walls.size() > 50);
    const WallsAt& row = both.walls[10];
    REQUIRE(row.measured);
    REQUIRE(row.predicted);
    CHECK(row.measured->left_nm == Approx(-32));
    CHECK(row.measured->right_nm == Approx(27));
    CHECK(row.predicted->right_nm - row.predicted->left_nm == Approx(60).margin(1e-9));
    const std::string csv = comparison_csv(c, compare_measured(c, state));
    CHECK(csv.find("feature,cut_nm,z_nm,measured_left_nm") != std::string::npos);
}

TEST_CASE("measured contour: the sampling error of the distance is that of the wall",
          "[measured]") {
    // Oracle: a contour 2 nm outside one wall; every batch moves the whole wall by +-sqrt(7) nm,
    // a standard error of 1 nm, 95 % = Student's t 2.364624 (7 degrees of freedom, handbook
    // table, from memory). Tolerance: 1e-6.
    Case c = tests::trench_case();
    c.measured.contour = contour({{-32, -20}, {-32, -120}});
    SurfaceState state = box_trench(c);
    for (int b = 0; b < 8; ++b)
        state.displacement.emplace_back(state.surface.size(), (b % 2 ? 1 : -1) * std::sqrt(7.0));
    const ContourComparison result = compare_measured(c, state).contours[0];
    CHECK(result.rms_error_nm == Approx(2.364624).epsilon(1e-6));
    CHECK(result.walls[5].width_error_nm == Approx(2 * 2.364624).epsilon(1e-6));
}

TEST_CASE("CD table: the mean with its error beside the predicted CD", "[measured]") {
    // Oracle: 62 nm, sigma 3 nm on 9 sites: 95 % half-width 1.96 nm (normal distribution).
    // Source: handbook table, from memory. Tolerance: 1e-4.
    Case c = tests::trench_case();
    Problems problems;
    c.measured.cds = parse_cd_table("cd,mean_nm,sigma_nm,sites\nmiddle,62,3,9\n", "cd.csv",
                                    {"trench"}, {"top", "middle", "bottom"}, problems);
    REQUIRE(problems.empty());
    CHECK(c.measured.cds[0].error() == Approx(1.96).epsilon(1e-4));
    const Metrics metrics = measure(c, box_trench(c));
    const Metric* difference = metrics.find("middle cd difference", "trench");
    REQUIRE(difference != nullptr);
    CHECK(*difference->value == Approx(-2).margin(1e-9));
    CHECK(metrics_json(c, metrics)["comparison"]["cds"][0]["measured_nm"] == 62.0);

    parse_cd_table("cd,mean_nm,sigma_nm,sites\nmidle,62,3,0\n", "cd.csv", {"trench"},
                   {"top", "middle", "bottom"}, problems);
    try {
        problems.throw_if_any();
        FAIL("should have thrown");
    } catch (const InputError& error) {
        const std::string text = error.what();
        CHECK(text.find("cd.csv:2:1: no height of measure.cd is called \"midle\"") == 0);
        CHECK(text.find("cd.csv:2:12: \"0\": a whole number of sites from 1 is due") !=
              std::string::npos);
    }
}
