// SPDX-License-Identifier: Apache-2.0
#include "engine/palette.hpp"
#include "tests/report/chart_samples.hpp"

#include <array>
#include <catch2/catch.hpp>
#include <set>

using namespace rille;
using namespace rille::engine;

namespace {

constexpr FigureForm forms[] = {FigureForm::page, FigureForm::narrow, FigureForm::slide};
constexpr const char* form_names[] = {"page", "narrow", "slide"};

/// Where the marker of a point was put: the translation in its group.
std::array<double, 2> marker_of(const std::string& svg, const std::string& key) {
    const std::size_t group = svg.find("data-point=\"" + key + "\"");
    REQUIRE(group != std::string::npos);
    const std::size_t move = svg.find("translate(", group);
    double x = 0, y = 0;
    REQUIRE(std::sscanf(svg.c_str() + move, "translate(%lf %lf)", &x, &y) == 2);
    return {x, y};
}

/// Position of an axis label: "x" of a centred text or the middle of its height.
const tests::SetText& text_named(const std::vector<tests::SetText>& texts,
                                 const std::string& content) {
    const auto found = std::find_if(texts.begin(), texts.end(),
                                    [&](const auto& t) { return t.content == content; });
    REQUIRE(found != texts.end());
    return *found;
}

bool is_round(double value) {
    if (value == 0) return true;
    double lead = std::fabs(value);
    while (lead >= 9.9999)
        lead /= 10;
    while (lead < 0.99999)
        lead *= 10;
    // A multiple of a step 1, 2 or 5: at most two digits that matter.
    return std::fabs(10 * lead - std::round(10 * lead)) < 1e-6;
}

/// Linear sRGB to what an eye without green (or red) cones sees.
/// Source: Vienot, Brettel, Mollon 1999, from memory.
std::array<double, 3> dichromat(const std::string& colour, bool without_green) {
    std::array<double, 3> c{};
    for (int i = 0; i < 3; ++i) {
        const double v = std::stoi(colour.substr(1 + 2 * i, 2), nullptr, 16) / 255.0;
        c[i] = v <= 0.04045 ? v / 12.92 : std::pow((v + 0.055) / 1.055, 2.4);
    }
    const double mixed =
        without_green ? 0.29275 * c[0] + 0.70725 * c[1] : 0.11238 * c[0] + 0.88762 * c[1];
    const double blue = without_green ? -0.02234 * c[0] + 0.02234 * c[1] + c[2]
                                      : 0.00401 * c[0] - 0.00401 * c[1] + c[2];
    return {mixed, mixed, blue};
}

} // namespace

TEST_CASE("line chart: points lie where the axes say") {
    const LineChart chart = tests::sample_lines();
    for (const FigureForm form : forms) {
        const std::string svg = chart_svg(chart, form);
        const auto texts = tests::texts_of(svg);
        // Two points of one line fix the x scale; labels of the axis must lie on it.
        const auto first = marker_of(svg, "0"), last = marker_of(svg, "7");
        const tests::SetText& label = text_named(texts, form == FigureForm::narrow ? "600" : "400");
        const double value = std::stod(label.content);
        const double x = first[0] + (value - 100) / 700 * (last[0] - first[0]);
        CHECK(label.box.x + 0.5 * label.box.width == Approx(x).margin(0.1));
        // y: 1.4 at point 0, 4.2 at point 7; the label "4" lies between.
        const tests::SetText& four = text_named(texts, "4");
        const double y = first[1] + (4 - 1.4) / (4.2 - 1.4) * (last[1] - first[1]);
        CHECK(four.box.y + (0.8 - 0.35) * four.size == Approx(y).margin(0.1));
        CHECK(std::fabs(four.box.y + 0.45 * four.size - (y + 2)) > 1); // the check can fail
    }
}

TEST_CASE("line chart: texts stay on the page and apart, in every form") {
    LineChart chart = tests::sample_lines();
    int kept = 0;
    for (const FigureForm form : forms) {
        const std::string svg = chart_svg(chart, form);
        CHECK(tests::text_faults(svg) == std::vector<std::string>{});
        tests::keep_figure(std::string("lines_") + form_names[kept++], svg,
                           form == FigureForm::slide ? 1 : 1.5);
    }
    // Seeded fault: the same label set twice is found.
    std::string svg = chart_svg(chart, FigureForm::page);
    const std::size_t text = svg.find("<text"), end = svg.find("</text>", text) + 7;
    svg.insert(end, svg.substr(text, end - text));
    CHECK(tests::text_faults(svg).size() == 1);
}

TEST_CASE("line chart: a slide is 1920 x 1080 with the content of the page") {
    const LineChart chart = tests::sample_lines();
    const std::string slide = chart_svg(chart, FigureForm::slide);
    CHECK(slide.find("width=\"1920\" height=\"1080\"") != std::string::npos);
    for (const FigureForm form : forms) {
        std::string all;
        for (const auto& text : tests::texts_of(chart_svg(chart, form)))
            all += text.content + " ";
        for (const char* part : {"Stays constant:", "not a released recipe", "bottom CD loss (nm)",
                                 "rf bias amplitude (V)", "70 nm", "measured"})
            CHECK(all.find(part) != std::string::npos);
    }
    for (const auto& text : tests::texts_of(slide))
        CHECK(text.size >= 20);
}

TEST_CASE("line chart: open markers, bars and lines of their own looks") {
    const std::string svg = chart_svg(tests::sample_lines(), FigureForm::page);
    const auto count = [&](const std::string& part) {
        std::size_t n = 0;
        for (std::size_t at = svg.find(part); at != std::string::npos; at = svg.find(part, at + 1))
            ++n;
        return n;
    };
    CHECK(count("class=\"mark\" fill=\"#ffffff\"") == 2);
    CHECK(count("class=\"mark\"") == 40);
    CHECK(count("class=\"bar\"") == 42);
    CHECK(count("data-point=") == 40);
}

TEST_CASE("line chart: nothing, one point, equal points, values that are none") {
    LineChart chart;
    chart.text = tests::sample_text("few");
    chart.x.title = "x";
    chart.y.title = "y";
    for (const auto& points : std::vector<std::vector<ChartPoint>>{
             {},
             {{3, 5, 0, false, "0", ""}},
             {{0, 0, 0, false, "0", ""}},
             {{1, 2, 0, false, "0", ""}, {1, 2, 0, false, "1", ""}},
             {{1, std::nan(""), 0, false, "0", ""}, {2, INFINITY, 0, false, "1", ""}},
             {{1, 1e-9, 0, false, "0", ""}, {2, 3e-9, 1e-10, false, "1", ""}},
             {{1, -7e7, 0, false, "0", ""}, {2, 3e7, 1e6, false, "1", ""}}}) {
        for (const bool logarithmic : {false, true})
            for (const FigureForm form : forms) {
                chart.lines = {{"a", points, true, true, {}, false}};
                chart.x.logarithmic = chart.y.logarithmic = logarithmic;
                const std::string svg = chart_svg(chart, form);
                CHECK(tests::text_faults(svg) == std::vector<std::string>{});
                CHECK(svg.find("nan") == std::string::npos);
                CHECK(svg.find("inf") == std::string::npos);
                CHECK_NOTHROW(png_of(svg, 0.2));
            }
    }
}

TEST_CASE("line chart: a logarithmic axis places decades evenly") {
    LineChart chart;
    chart.text = tests::sample_text("log");
    chart.x = {"pressure", "mTorr", true, {}, {}, false, {}};
    chart.y = {"rate", "nm/min", true, {}, {}, false, {}};
    chart.lines = {{"", {}, true, true, {}, false}};
    for (int k = 0; k < 4; ++k)
        chart.lines[0].points.push_back(
            {std::pow(10, k), 3 * std::pow(10, -k), 0, false, std::to_string(k), ""});
    const std::string svg = chart_svg(chart, FigureForm::page);
    tests::keep_figure("log", svg, 1.5);
    const double step = marker_of(svg, "1")[0] - marker_of(svg, "0")[0];
    CHECK(step > 50);
    CHECK(marker_of(svg, "3")[0] - marker_of(svg, "2")[0] == Approx(step).margin(0.05));
    CHECK(marker_of(svg, "3")[1] - marker_of(svg, "2")[1] ==
          Approx(marker_of(svg, "1")[1] - marker_of(svg, "0")[1]).margin(0.05));
}

TEST_CASE("ticks are round, inside the range and not too many") {
    for (const double low : {-7.3e4, -3.0, 0.0, 0.0113, 12.0, 999.0})
        for (const double span : {1e-3, 0.7, 3.0, 41.0, 1e5})
            for (const std::size_t most : {2u, 5u, 9u}) {
                const auto ticks = round_ticks(low, low + span, most);
                CHECK(ticks.size() <= most);
                if (most >= 5) CHECK(ticks.size() >= 2);
                for (const double tick : ticks) {
                    CHECK(tick >= low - 1e-6 * span);
                    CHECK(tick <= low + span * (1 + 1e-6));
                    if (ticks.size() > 1) CHECK(is_round(ticks[1] - ticks[0]));
                }
            }
    CHECK(log_ticks(1, 1000, 4) == std::vector<double>{1, 10, 100, 1000});
    CHECK(log_ticks(100, 800, 6) == std::vector<double>{100, 200, 500});
    CHECK_FALSE(is_round(0.3333));
}

TEST_CASE("looks of lines: readable on white, apart for every eye, no two alike") {
    std::set<std::string> seen;
    for (std::size_t i = 0; i < 24; ++i) {
        const LineLook a = line_look(i);
        CHECK(seen.insert(a.colour + a.dashes + std::to_string(a.marker)).second);
        const double l = lightness(a.colour);
        const double luminance = std::pow((l + 16) / 116, 3);
        CHECK(1.05 / (luminance + 0.05) >= 3);
    }
    // Lines whose colours an eye without red or green cones could mix up have other dashes.
    for (std::size_t i = 0; i < 8; ++i)
        for (std::size_t j = 0; j < i; ++j) {
            const LineLook a = line_look(i), b = line_look(j);
            CHECK(a.marker != b.marker);
            for (const bool without_green : {false, true}) {
                const auto p = dichromat(a.colour, without_green),
                           q = dichromat(b.colour, without_green);
                const double apart =
                    std::hypot(std::cbrt(p[0]) - std::cbrt(q[0]),
                               std::cbrt(std::max(p[2], 0.0)) - std::cbrt(std::max(q[2], 0.0)));
                CHECK((apart > 0.1 || a.dashes != b.dashes));
            }
        }
}
