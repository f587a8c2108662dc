// SPDX-License-Identifier: Apache-2.0
#include "engine/palette.hpp"
#include "tests/report/chart_samples.hpp"

#include <array>
#include <catch2/catch.hpp>
#include <fmt/format.h>
#include <set>

using namespace rille;
using namespace rille::engine;

namespace {

constexpr FigureForm forms[] = {FigureForm::page, FigureForm::narrow, FigureForm::slide};
constexpr const char* form_names[] = {"page", "narrow", "slide"};

std::size_t count(const std::string& text, const std::string& part) {
    std::size_t n = 0;
    for (std::size_t at = text.find(part); at != std::string::npos; at = text.find(part, at + 1))
        ++n;
    return n;
}

template <class Chart>
void check_forms(const Chart& chart, const std::string& name) {
    int i = 0;
    for (const FigureForm form : forms) {
        const std::string svg = chart_svg(chart, form);
        CHECK(tests::text_faults(svg) == std::vector<std::string>{});
        CHECK(svg.find("nan") == std::string::npos);
        tests::keep_figure(name + "_" + form_names[i++], svg, form == FigureForm::slide ? 1 : 1.5);
        if (form == FigureForm::slide)
            CHECK(svg.find("width=\"1920\" height=\"1080\"") != std::string::npos);
    }
}

HeatMap sample_map(int nx, int ny) {
    HeatMap map;
    map.text = tests::sample_text("map");
    map.x_title = "rf bias amplitude (V)";
    map.y_title = "pressure (mTorr)";
    map.value_title = "bottom CD loss (nm)";
    for (int i = 0; i < nx; ++i)
        map.x_values.push_back(std::to_string(100 * (i + 1)));
    for (int j = 0; j < ny; ++j)
        map.y_values.push_back(std::to_string(5 * (j + 1)));
    for (int j = 0; j < ny; ++j)
        for (int i = 0; i < nx; ++i) {
            const double v = 1 + 0.7 * i - 0.4 * j;
            map.cells.push_back({CellKind::value, v, fmt::format("{:.1f} ± 0.2", v),
                                 std::to_string(j * nx + i), "a cell"});
        }
    return map;
}

/// Colour of the first rectangle in the group of a key.
std::string colour_of(const std::string& svg, const std::string& key) {
    const std::size_t group = svg.find("data-point=\"" + key + "\"");
    REQUIRE(group != std::string::npos);
    return svg.substr(svg.find("fill=\"", group) + 6, 7);
}

ProfileRow sample_row(int panels) {
    ProfileRow row;
    row.text = tests::sample_text("row");
    row.axis_title = "rf bias amplitude (V)";
    row.before = {{{{-60, 40}, {-30, 40}, {-30, 0}, {30, 0}, {30, 40}, {60, 40}}, {}, false}};
    for (int i = 0; i < panels; ++i) {
        ProfileOutline panel;
        panel.name = std::to_string(100 * (i + 1)) + " V";
        panel.lines = tests::trench_section(58 - 2 * i, 200 + 10 * i);
        panel.note = fmt::format("{:.1f} ± 0.2 nm", 1 + 0.4 * i);
        panel.key = std::to_string(i);
        if (i == 2) {
            panel.is_failed = true;
            panel.lines.clear();
            panel.note = "failed";
        }
        row.panels.push_back(panel);
    }
    return row;
}

} // namespace

TEST_CASE("heat map: cells where their axes say, shaded by one scale") {
    const HeatMap map = sample_map(8, 3);
    check_forms(map, "map");
    const std::string svg = chart_svg(map, FigureForm::page);
    // Largest value: last column, first row; smallest: first column, last row.
    CHECK(colour_of(svg, "7") == heat_colour(1));
    CHECK(colour_of(svg, "16") == heat_colour(0));
    CHECK(colour_of(svg, "0") != heat_colour(0));
    // A cell's text stands over its label: column 5 is 500, row 2 is 15.
    const auto texts = tests::texts_of(svg);
    const auto named = [&](const std::string& content) {
        for (const auto& t : texts)
            if (t.content == content) return t;
        FAIL("no text " << content);
        return texts.front();
    };
    const auto cell = named("3.0 ± 0.2"), across = named("500"), up = named("15");
    CHECK(cell.box.x + 0.5 * cell.box.width ==
          Approx(across.box.x + 0.5 * across.box.width).margin(0.1));
    CHECK(cell.box.y + 0.45 * cell.size == Approx(up.box.y + 0.45 * up.size).margin(0.1));
}

TEST_CASE("heat map: what gave no value is hatched and said, verdicts are words") {
    HeatMap map = sample_map(4, 3);
    map.cells[1] = {CellKind::failed, {}, "", "1", ""};
    map.cells[2].kind = CellKind::open;
    map.cells[3] = {CellKind::missing, {}, "", "3", ""};
    check_forms(map, "map_kinds");
    const std::string svg = chart_svg(map, FigureForm::page);
    for (const char* part : {">failed<", ">(2.4 ± 0.2)<", ">failed, no value<", ">not run<",
                             "url(#map-hatch-2)", "url(#map-hatch-1)"})
        CHECK(svg.find(part) != std::string::npos);
    for (std::size_t i = 0; i < map.cells.size(); ++i)
        map.cells[i] = {i % 3 == 0   ? CellKind::met
                        : i % 3 == 1 ? CellKind::missed
                                     : CellKind::undecided,
                        {},
                        "",
                        std::to_string(i),
                        ""};
    check_forms(map, "window");
    const std::string window = chart_svg(map, FigureForm::page);
    CHECK(count(window, ">met<") == 5); // four cells and the key
    CHECK(window.find(map.value_title) == std::string::npos);
}

TEST_CASE("heat map: one cell, none, many, equal values") {
    check_forms(sample_map(1, 1), "map_one");
    check_forms(sample_map(0, 0), "map_none");
    check_forms(sample_map(40, 25), "map_many");
}

TEST_CASE("heat scale: lightness falls evenly") {
    double before = lightness(heat_colour(0));
    const double whole = before - lightness(heat_colour(1));
    CHECK(whole > 60);
    for (int i = 1; i <= 20; ++i) {
        const double now = lightness(heat_colour(i / 20.0));
        CHECK(before - now > 0.5 * whole / 20);
        CHECK(before - now < 1.6 * whole / 20);
        before = now;
    }
}

TEST_CASE("row of profiles: one scale, failed ones hatched") {
    for (const int panels : {1, 5, 8, 24})
        check_forms(sample_row(panels), "row_" + std::to_string(panels));
    const std::string svg = chart_svg(sample_row(5), FigureForm::page);
    CHECK(count(svg, "class=\"panel\"") == 5);
    CHECK(count(svg, "url(#row-failed)") == 1);
    CHECK(count(svg, "data-point=") == 5);
    ProfileRow none;
    none.text = tests::sample_text("none");
    check_forms(none, "row_none");
}

TEST_CASE("overlay: outlines to one scale with their legend") {
    ProfileOverlay overlay;
    overlay.text = tests::sample_text("overlay");
    overlay.before = sample_row(1).before;
    for (int i = 0; i < 4; ++i) {
        ProfileOutline o;
        o.name = "run " + std::to_string(i + 1);
        o.note = "bottom CD 54.2 ± 0.3 nm";
        o.lines = tests::trench_section(58 - 6 * i, 200 + 10 * i);
        overlay.outlines.push_back(o);
    }
    overlay.heights = {-100};
    check_forms(overlay, "overlay");
    // Width and depth are to one scale: the box of 120 nm by 230 nm + 12 % air.
    const std::string svg = chart_svg(overlay, FigureForm::page);
    const std::size_t frame = svg.find("fill=\"none\" stroke=\"#333333\"");
    const std::string rect = svg.substr(svg.rfind("<rect", frame), 200);
    const double ratio = tests::attribute(rect, "height") / tests::attribute(rect, "width");
    CHECK(ratio == Approx(270 * 1.12 / 120).epsilon(1e-3));
    overlay.outlines.clear();
    check_forms(overlay, "overlay_none");
    // A section far deeper than wide is stretched, and says so.
    overlay.before = {{{{-10, 0}, {-5, -2000}, {5, -2000}, {10, 0}}, {}, false}};
    check_forms(overlay, "overlay_deep");
    CHECK(chart_svg(overlay, FigureForm::page).find("times the scale of depths") !=
          std::string::npos);
}

TEST_CASE("bars: lengths in proportion, texts beside") {
    BarChart chart;
    chart.text = tests::sample_text("bars");
    chart.axis_title = "share of the time (%)";
    chart.bars = {{"ions", 62, 0, "62 %, 41 s"},
                  {"neutrals", 31, 4, "31 %, 20 s"},
                  {"advance of the front", 7, 0, "7 %, 5 s"}};
    check_forms(chart, "bars");
    const std::string svg = chart_svg(chart, FigureForm::page);
    std::vector<double> widths;
    for (std::size_t at = svg.find("class=\"share\""); at != std::string::npos;
         at = svg.find("class=\"share\"", at + 1))
        widths.push_back(tests::attribute(svg.substr(svg.rfind("<rect", at), 100), "width"));
    REQUIRE(widths.size() == 3);
    CHECK(widths[0] / widths[2] == Approx(62.0 / 7).epsilon(1e-3));
    chart.bars[2].value = -7;
    check_forms(chart, "bars_signed");
    chart.bars.clear();
    check_forms(chart, "bars_none");
}
