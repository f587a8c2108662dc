// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"
#include "engine/profile_csv.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

using namespace rille;
using namespace rille::engine;
using tests::Vec3;

namespace {

double value_of(const Metrics& m, const std::string& name) {
    const Metric* metric = m.find(name);
    REQUIRE(metric != nullptr);
    REQUIRE(metric->value.has_value());
    return *metric->value;
}

SurfaceState state_of(const Case& c, const std::vector<Vec3>& half, double length = 1.0) {
    std::vector<Vec3> points = half;
    for (auto p = half.rbegin(); p != half.rend(); ++p)
        points.push_back({-p->x, 0, p->z});
    SurfaceState state;
    state.surface = tests::polyline(c.domain, points, length);
    return state;
}

/// Every element displaced by the same amount per batch, with sum of squares 8 * 7: the standard
/// error of one element's position is then 1 nm.
void shake(SurfaceState& state) {
    for (int b = 0; b < 8; ++b)
        state.displacement.emplace_back(state.surface.size(), (b % 2 ? 1 : -1) * std::sqrt(7.0));
}

constexpr double student = 2.364624; // 97.5 %, 7 degrees of freedom

} // namespace

TEST_CASE("metrics: a tapered trench with a faceted mask against closed forms") {
    // Oracle: lengths and angles read off the polygon. Mask top at 120 of 180 nm, facet from
    // (-45, 120) to (-33, 100), mask wall to (-30, 0), film wall to (-24, -246), flat floor.
    // Source: derived here. Tolerance: 1e-9 nm (round-off), 1e-6 deg.
    const Case c = tests::trench_case();
    const SurfaceState state =
        state_of(c, {{-80, 0, 120}, {-45, 0, 120}, {-33, 0, 100}, {-30, 0, 0}, {-24, 0, -246}});
    const Metrics m = measure(c, state);
    const auto width = [](double z) { return 2 * (30 + 6 * z / 246); };
    CHECK(value_of(m, "depth centre") == Approx(246).margin(1e-9));
    CHECK(value_of(m, "depth edge") == Approx(246).margin(1e-9));
    CHECK(value_of(m, "microtrench depth") == Approx(0).margin(1e-9));
    CHECK(value_of(m, "top cd") == Approx(width(-10)).margin(1e-9));
    CHECK(value_of(m, "middle cd") == Approx(width(-120)).margin(1e-9));
    CHECK(value_of(m, "bottom cd") == Approx(width(-230)).margin(1e-9));
    CHECK_FALSE(value_of(m, "bottom cd") == Approx(1.02 * width(-230)).margin(1e-9));
    CHECK(value_of(m, "bottom cd_change") == Approx(width(-230) - 60).margin(1e-9));
    CHECK(value_of(m, "bottom cd_loss") == Approx(width(-230) - 60).margin(1e-9));
    CHECK(value_of(m, "bow cd") == Approx(60).margin(1e-6));
    CHECK(value_of(m, "bow") == Approx(60 - width(-10)).margin(1e-6));
    CHECK(value_of(m, "bow depth") == Approx(0).margin(1e-6));
    const double angle = 90 - std::atan(6.0 / 246) * 180 / M_PI;
    CHECK(value_of(m, "sidewall angle left") == Approx(angle).margin(1e-6));
    CHECK(value_of(m, "sidewall angle right") == Approx(angle).margin(1e-6));
    CHECK(value_of(m, "mask left") == Approx(120).margin(1e-9));
    CHECK(value_of(m, "selectivity") == Approx(246.0 / 60).margin(1e-9));
    CHECK(value_of(m, "facet angle") == Approx(std::atan2(20, 12) * 180 / M_PI).margin(1e-6));
    // Undercut: half the difference of the CD one spacing (2 nm) below and above the mask bottom.
    CHECK(value_of(m, "undercut") ==
          Approx(0.5 * (width(-2) - (60 + 2 * 2 * 3.0 / 100))).margin(1e-9));
    CHECK(value_of(m, "stop loss") == Approx(6).margin(1e-9));
    REQUIRE(m.clearing.size() == 2);
    CHECK(m.clearing[0].film == "gate");
    CHECK(m.clearing[0].cleared);
    CHECK(m.clearing[1].film == "stop");
    CHECK_FALSE(m.clearing[1].cleared);
    CHECK(m.clearing[1].remaining_nm == Approx(6).margin(1e-9));
}

TEST_CASE("metrics: lines lose what openings gain") {
    // Oracle: two trenches, 30 nm wide at -40 and at 40 nm in a period of 160 nm, so that every
    // line is 50 nm wide as drawn. Walls that moved out by 1 and 2 nm (left trench) and by 3 and 4
    // nm (right one), at a height that all four walls cross. Source: derived here. Tolerance: 1e-9
    // nm.
    Case c = tests::trench_case();
    c.mask.openings[0].width_x = 30;
    c.mask.openings[0].centre_x = -40;
    c.mask.openings.push_back(c.mask.openings[0]);
    c.mask.openings[1].name = "right";
    c.mask.openings[1].centre_x = 40;
    const auto measured = [&](double floor_right) {
        SurfaceState state;
        state.surface = tests::polyline(c.domain,
                                        {{-80, 0, 120},
                                         {-56, 0, 120},
                                         {-56, 0, -246},
                                         {-23, 0, -246},
                                         {-23, 0, 120},
                                         {22, 0, 120},
                                         {22, 0, floor_right},
                                         {59, 0, floor_right},
                                         {59, 0, 120},
                                         {80, 0, 120}},
                                        1.0);
        return measure(c, state);
    };
    const auto loss = [](const Metrics& m, const char* feature) {
        const Metric* metric = m.find("bottom cd_loss", feature);
        REQUIRE(metric != nullptr);
        return metric->value;
    };
    const double middle = 2 + 3; // of the line between them
    const std::string left = c.mask.openings[0].name;
    c.domain.sides = geometry::Sides::mirror; // the outer lines meet their own images
    CHECK(*loss(measured(-246), left.c_str()) == Approx(0.5 * (middle + 2 * 1)).margin(1e-9));
    CHECK(*loss(measured(-246), "right") == Approx(0.5 * (middle + 2 * 4)).margin(1e-9));
    c.domain.sides = geometry::Sides::periodic; // the outer line is one
    CHECK(*loss(measured(-246), left.c_str()) == Approx(0.5 * (middle + 1 + 4)).margin(1e-9));
    CHECK(*loss(measured(-246), "right") == Approx(0.5 * (middle + 1 + 4)).margin(1e-9));
    CHECK(*measured(-246).find("bottom cd_change", "right")->value == Approx(7).margin(1e-9));
    // The right trench does not come down to that height: there is no line beside either.
    CHECK_FALSE(loss(measured(-100), left.c_str()));
    CHECK_FALSE(loss(measured(-100), "right"));
}

TEST_CASE("metrics: bow is measured on film walls, and the mask does not count") {
    // Oracle: widest at (-38, -80) on the film wall; the mask is wider still. Source: derived here.
    // Tolerance: 1e-9 nm.
    const Case c = tests::trench_case();
    const SurfaceState state = state_of(c, {{-80, 0, 120},
                                            {-50, 0, 120},
                                            {-30, 0, 0},
                                            {-30, 0, -20},
                                            {-38, 0, -80},
                                            {-28, 0, -200},
                                            {-28, 0, -210},
                                            {-20, 0, -214},
                                            {-12, 0, -210}});
    const Metrics m = measure(c, state);
    CHECK(value_of(m, "bow cd") == Approx(76).margin(1e-9));
    CHECK(value_of(m, "bow depth") == Approx(80).margin(1e-9));
    CHECK(value_of(m, "bow") == Approx(16).margin(1e-9));
    CHECK(value_of(m, "microtrench depth") == Approx(4).margin(1e-9));
    const Metric* bottom = m.find("bottom cd"); // 10 nm above the stop lies below this floor
    REQUIRE(bottom != nullptr);
    CHECK_FALSE(bottom->value.has_value());
    CHECK_FALSE(bottom->note.empty());
    CHECK(metrics_json(c, m)["metrics"].dump().find("\"value\":null") != std::string::npos);
}

TEST_CASE("metrics: sampling errors from the batches") {
    // Oracle: every element moved out by u_b, standard error 1 nm: a CD between upright walls has
    // weight -1 on either side, so its error is 2 t; a flat floor's is t; the selectivity D / L has
    // d(D / L) = (-1 / L + D / L^2) u for floor and mask top that rise together.
    // Source: SE^2 = sum w_b^2 / (8 * 7), derived here. Tolerance: 1e-6 relative (the digits of t).
    const Case c = tests::trench_case();
    SurfaceState state = state_of(c, {{-80, 0, 120}, {-30, 0, 120}, {-30, 0, -246}});
    CHECK(measure(c, state).find("top cd")->sampling_error == 0);
    shake(state);
    const Metrics m = measure(c, state);
    CHECK(m.find("top cd")->sampling_error == Approx(2 * student).epsilon(1e-6));
    CHECK(m.find("depth centre")->sampling_error == Approx(student).epsilon(1e-6));
    const double depth = 246, loss = 60;
    CHECK(m.find("selectivity")->sampling_error ==
          Approx(student * std::fabs(-1 / loss + depth / (loss * loss))).epsilon(1e-6));
    // Left and right walls that err against each other leave the CD as it is.
    for (auto& batch : state.displacement)
        for (std::size_t e = 0; e < batch.size(); ++e)
            if (state.surface.centre[e].x < 0) batch[e] = -batch[e];
    CHECK(measure(c, state).find("top cd")->sampling_error == Approx(0).margin(1e-9));
}

TEST_CASE("metrics: mask gone, nothing etched, feature closed") {
    const Case c = tests::trench_case();
    Metrics m = measure(c, state_of(c, {{-80, 0, -20}, {-30, 0, -20}, {-30, 0, -246}}));
    CHECK(value_of(m, "mask left") == 0);
    CHECK(m.find("undercut") != nullptr);
    CHECK_FALSE(m.find("undercut")->value.has_value());
    CHECK_FALSE(m.find("selectivity")->value.has_value()); // the film went on after the mask
    m = measure(c, state_of(c, {{-80, 0, 180}, {-30, 0, 180}, {-30, 0, 0}}));
    CHECK(value_of(m, "depth centre") == Approx(0).margin(1e-9));
    CHECK_FALSE(m.find("selectivity")->value.has_value());
    CHECK_FALSE(m.find("sidewall angle left")->value.has_value());
    CHECK(m.clearing.empty());
    CHECK_FALSE(metrics_table(c, m).empty());
}

TEST_CASE("metrics: a round hole has CD in x, in y and by area") {
    // Oracle: a 96-sided prism of radius 30 nm whose corners lie on the axes: widths 60 along x and
    // y; area (96 / 2) r^2 sin(2 pi / 96). Source: derived here. Tolerance: 1e-6 nm.
    Case c = tests::trench_case();
    c.domain.symmetry = geometry::Symmetry::full;
    c.domain.cells_y = 80;
    c.mask.thickness = 0;
    c.mask.openings[0].shape = geometry::Opening::Shape::round;
    c.mask.openings[0].width_y = 60;
    SurfaceState state;
    state.surface = tests::revolved_hole(
        c.domain, {{30, 0}, {30, -60}, {30, -120.5}, {30, -246}, {0, -246}}, 96);
    const Metrics m = measure(c, state);
    CHECK(value_of(m, "top cd") == Approx(value_of(m, "top cd y")).margin(1e-6));
    const double area = 48 * 900 * std::sin(2 * M_PI / 96);
    CHECK(value_of(m, "top cd area") == Approx(2 * std::sqrt(area / M_PI)).margin(1e-6));
    CHECK(value_of(m, "middle cd") <= 60 + 1e-9);
    CHECK(value_of(m, "middle cd") >= 60 * std::cos(M_PI / 96) - 1e-9);
}

TEST_CASE("targets: met, missed, undecided") {
    Target range;
    range.at_least = 55;
    range.at_most = 65;
    CHECK(judge(60, 1, range) == Verdict::met);
    CHECK(judge(60, 6, range) == Verdict::undecided);
    CHECK(judge(54, 0.5, range) == Verdict::missed);
    CHECK(judge(54, 1.5, range) == Verdict::undecided);
    CHECK(judge(65, 0, range) == Verdict::met);
    CHECK(judge(65.5, 0.4, range) == Verdict::missed);
    CHECK(judge(std::nan(""), 0.4, range) == Verdict::undecided);
    Target bow;
    bow.at_most = 4;
    CHECK(judge(-3, 0.5, bow) == Verdict::met);
    CHECK(judge(4.2, 0.5, bow) == Verdict::undecided);
}

TEST_CASE("targets: the standing of parameters keeps a verdict open, and is named") {
    Case c = tests::trench_case();
    Target target;
    target.metric = "bow";
    target.at_most = 4;
    target.text = "at most 4 nm";
    Target unknown;
    unknown.metric = "nonsense";
    Target missing;
    missing.metric = "bottom cd";
    missing.at_least = 55;
    c.targets = {target, unknown, missing};
    Metrics m;
    m.metrics = {{"bow", "trench", 6.1, "nm", 0.3, "", ""},
                 {"bottom cd", "trench", {}, "nm", 0, "", "no wall at this height"}};
    auto verdicts = judge_targets(c, m);
    REQUIRE(verdicts.size() == 3);
    CHECK(verdicts[0].verdict == Verdict::undecided);
    CHECK(verdicts[0].by_numbers == Verdict::missed);
    CHECK(verdicts[0].reason.find("silicon-cl2-ar") != std::string::npos);
    CHECK(verdicts[0].reason.find("2 illustrative and 5 from memory") != std::string::npos);
    CHECK(verdicts[1].verdict == Verdict::undecided);
    c.standing = {{fluxes::Standing::published, 14}};
    verdicts = judge_targets(c, m);
    CHECK(verdicts[0].verdict == Verdict::missed);
    CHECK(verdicts[2].verdict == Verdict::missed);
    CHECK(verdicts[2].reason.find("no wall at this height") != std::string::npos);
    m.metrics[0].value = 3.0;
    CHECK(judge_targets(c, m)[0].verdict == Verdict::met);
    c.targets = {target};
    c.targets[0].metric = "bow of other";
    CHECK(judge_targets(c, m)[0].reason.find("no metric") != std::string::npos);
}

TEST_CASE("targets at the end of a step are judged by what was measured there") {
    Case c = tests::trench_case();
    c.standing = {{fluxes::Standing::published, 14}};
    Target early;
    early.metric = "mask left";
    early.at_least = 100;
    early.text = "at least 100 nm";
    early.after = "main";
    Target late = early;
    late.after.clear();
    Target unknown = early;
    unknown.after = "over";
    c.targets = {early, late, unknown};
    CHECK(is_measured_after(c, "main"));
    CHECK_FALSE(is_measured_after(c, "ash"));
    Metrics m;
    m.metrics = {{"mask left", "trench", 80.0, "nm", 1, "", ""}};
    m.after = {{"main", 40, {{"mask left", "trench", 120.0, "nm", 2, "", ""}}}};
    const auto verdicts = judge_targets(c, m);
    REQUIRE(verdicts.size() == 3);
    CHECK(verdicts[0].verdict == Verdict::met);
    CHECK(verdicts[0].target == "mask left after main: at least 100 nm");
    CHECK(verdicts[0].value == 120);
    CHECK(verdicts[0].after == "main");
    CHECK(verdicts[1].verdict == Verdict::missed);
    CHECK(verdicts[1].after.empty());
    CHECK(verdicts[2].verdict == Verdict::undecided);
    CHECK(verdicts[2].reason == "nothing is known of the end of step over");
    const auto json = metrics_json(c, m);
    CHECK(json["after_steps"][0]["step"] == "main");
    CHECK(json["after_steps"][0]["metrics"][0]["value"] == 120);
}
