// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/palette.hpp"
#include "engine/picture.hpp"
#include "geometry/front.hpp"
#include "geometry/initial_shape.hpp"
#include "tests/engine/output_samples.hpp"

#include <cairo.h>
#include <catch2/catch.hpp>
#include <cstdlib>
#include <cstring>
#include <fstream>
#include <map>
#include <set>

using namespace rille;
using namespace rille::engine;

namespace {

struct Image {
    int width = 0, height = 0;
    std::map<std::uint32_t, int> colours; ///< count of pixels by colour
};

Image decode(const std::string& png) {
    struct Source {
        const std::string& bytes;
        std::size_t at = 0;
    } source{png};
    const auto read = [](void* closure, unsigned char* data, unsigned int length) {
        auto& from = *static_cast<Source*>(closure);
        if (from.at + length > from.bytes.size()) return CAIRO_STATUS_READ_ERROR;
        std::memcpy(data, from.bytes.data() + from.at, length);
        from.at += length;
        return CAIRO_STATUS_SUCCESS;
    };
    cairo_surface_t* surface = cairo_image_surface_create_from_png_stream(read, &source);
    REQUIRE(cairo_surface_status(surface) == CAIRO_STATUS_SUCCESS);
    Image image{
        cairo_image_surface_get_width(surface), cairo_image_surface_get_height(surface), {}};
    const unsigned char* data = cairo_image_surface_get_data(surface);
    for (int y = 0; y < image.height; ++y)
        for (int x = 0; x < image.width; ++x) {
            std::uint32_t pixel;
            std::memcpy(&pixel, data + y * cairo_image_surface_get_stride(surface) + 4 * x, 4);
            ++image.colours[pixel & 0xffffff];
        }
    cairo_surface_destroy(surface);
    return image;
}

Metric metric(const std::string& name, double value, const std::string& unit, double error) {
    return {name, "trench", value, unit, error, "", ""};
}

Metrics sample_metrics() {
    Metrics m;
    m.time_s = 75.2;
    m.metrics = {metric("depth centre", 245.0, "nm", 0.8),
                 metric("depth edge", 249.6, "nm", 0.9),
                 metric("microtrench depth", 5.0, "nm", 0.3),
                 metric("bottom cd", 54.7, "nm", 0.4),
                 metric("middle cd", 63.9, "nm", 0.3),
                 metric("top cd", 63.2, "nm", 0.3),
                 metric("bow cd", 69.3, "nm", 0.4),
                 metric("bow", 6.1, "nm", 0.5),
                 metric("sidewall angle left", 88.9, "deg", 0.1),
                 metric("sidewall angle right", 88.9, "deg", 0.1),
                 metric("mask left", 85.0, "nm", 0.4),
                 metric("facet angle", 57.0, "deg", 0.6),
                 metric("selectivity", 2.58, "1", 0.02)};
    m.targets = {{"bottom cd: 55 to 65 nm", "bottom cd", "trench", Verdict::undecided,
                  Verdict::undecided, ""},
                 {"bow: at most 4 nm", "bow", "trench", Verdict::undecided, Verdict::missed, ""}};
    m.clearing = {{"trench", "gate", true, 0}, {"trench", "stop", false, 7}};
    return m;
}

std::vector<PictureFront> sample_fronts(const Case& c, int count, double end_s) {
    std::vector<PictureFront> fronts;
    for (int i = 0; i < count; ++i) {
        const double share = i / double(count - 1);
        fronts.push_back(
            {end_s * share, vertical_section(c.domain, tests::etched_trench(c.domain, share), 0)});
    }
    return fronts;
}

/// Leaves pictures for the eye where RILLE_TEST_PICTURES names a folder.
void keep(const std::string& name, const std::string& svg, const std::string& png) {
    const char* folder = std::getenv("RILLE_TEST_PICTURES");
    if (!folder) return;
    std::ofstream(std::string(folder) + "/" + name + ".svg") << svg;
    std::ofstream(std::string(folder) + "/" + name + ".png", std::ios::binary) << png;
}

} // namespace

TEST_CASE("picture: a trench, as SVG and PNG") {
    const Case c = tests::trench_case();
    const SurfaceState last = tests::trench_state(c, 1, 75.2);
    const std::string svg = picture_svg(c, sample_fronts(c, 11, 75.2), last, sample_metrics());
    for (const char* part :
         {"model prediction, not a released recipe", "14 published", "2 illustrative",
          "errors shown are numerical only", "54.7 ± 0.4", "gate, Si 240 nm", "polymer (grown)",
          "7.00 nm left", "bow: at most 4 nm"})
        CHECK(svg.find(part) != std::string::npos);
    CHECK(svg.find("http://") == svg.rfind("http://")); // the name space only: nothing is fetched
    const std::string png = png_of(svg, 2);
    keep("trench", svg, png);
    const Image image = decode(png);
    double width = 0, height = 0;
    REQUIRE(std::sscanf(std::strstr(svg.c_str(), "width=\""), "width=\"%lf\" height=\"%lf\"",
                        &width, &height) == 2);
    CHECK(image.width == std::lround(2 * width));
    CHECK(image.height == std::lround(2 * height));
    // Every material's own colour is there, over an area to be seen.
    for (const std::uint32_t colour : {0xc8662au, 0x7a9cc6u, 0xcfe6f0u}) {
        const auto found = image.colours.find(colour);
        REQUIRE(found != image.colours.end());
        CHECK(found->second > 2000);
    }
    CHECK(picture_svg(c, sample_fronts(c, 11, 75.2), last, sample_metrics()) == svg);
}

TEST_CASE("picture: a page that cannot be drawn is an error") {
    CHECK_THROWS_AS(png_of("<svg xmlns='http://www.w3.org/2000/svg'><g></svg>", 1), OutputError);
    CHECK_THROWS_AS(png_of("", 1), OutputError);
}

TEST_CASE("picture: titles may hold any character") {
    Case c = tests::trench_case();
    c.title = "a < b & \"c\" \x01 µm — " + std::string(200, 'w');
    const SurfaceState last = tests::trench_state(c, 0.5, 30);
    CHECK_NOTHROW(png_of(picture_svg(c, sample_fronts(c, 3, 30), last, sample_metrics()), 0.5));
}

TEST_CASE("picture: a void stays empty, the solid around it is filled") {
    Case c = tests::trench_case();
    c.cd_places.clear();
    SurfaceState last;
    last.surface = tests::polyline(c.domain, {{-80, 0, 0}, {80, 0, 0}}, 2);
    geometry::Surface loop; // walked with the gas on the left, so anticlockwise seen along -y
    const std::vector<tests::Vec3> ring = {
        {-30, 0, -40}, {30, 0, -40}, {30, 0, -160}, {-30, 0, -160}};
    const int first = static_cast<int>(last.surface.size());
    const int vertex = static_cast<int>(last.surface.vertices.size());
    for (int i = 0; i < 4; ++i)
        last.surface.vertices.push_back(ring[3 - i]);
    for (int i = 0; i < 4; ++i) {
        tests::add_element(last.surface, {vertex + i, vertex + (i + 1) % 4, -1, -1});
        last.surface.chain.back() = 1;
        last.surface.next.push_back(first + (i + 1) % 4);
        last.surface.previous.push_back(first + (i + 3) % 4);
    }
    const Section section = vertical_section(c.domain, last.surface, 0);
    REQUIRE(section.size() == 2);
    CHECK_FALSE(section[0].closed);
    CHECK(section[1].closed);
    double left = 0, right = 0;
    REQUIRE(walls_at(section, -100, 0, left, right));
    CHECK(left == Approx(-30));
    CHECK(right == Approx(30));
    const std::string svg = picture_svg(c, {{0, section}}, last, Metrics());
    const std::string png = png_of(svg, 1);
    keep("void", svg, png);
    SurfaceState solid = last;
    solid.surface = tests::polyline(c.domain,
                                    {
                                        {-80, 0, 0},
                                        {80, 0, 0},
                                    },
                                    2);
    CHECK(decode(png).colours.at(0x7a9cc6) > 10000);
}

TEST_CASE("picture: narrow periods are stretched and say so, wide ones turn the page") {
    Case c = tests::trench_case();
    c.films[1].bottom = c.films[2].top = -4000;
    c.films[2].bottom = c.films[3].top = -4050;
    c.cd_places = {{"top", {"", -100}}, {"middle", {"", -2000}}, {"bottom", {"", -3900}}};
    SurfaceState last;
    last.time_s = 900;
    last.surface = tests::polyline(
        c.domain,
        {{-80, 0, 120}, {-32, 0, 120}, {-28, 0, -4010}, {28, 0, -4010}, {32, 0, 120}, {80, 0, 120}},
        20);
    std::string svg = picture_svg(c, {{900, vertical_section(c.domain, last.surface, 0)}}, last,
                                  sample_metrics());
    CHECK(svg.find("times the scale of depths") != std::string::npos);
    keep("deep", svg, png_of(svg, 2));
    Case wide = tests::trench_case();
    wide.domain.cells_x = 600;
    const Image tall = decode(png_of(svg, 1));
    geometry::Opening second = wide.mask.openings[0];
    second.name = "wide";
    second.width_x = 300;
    second.centre_x = 300;
    wide.mask.openings[0].centre_x = -300;
    wide.mask.openings.push_back(second);
    last.surface = tests::polyline(wide.domain,
                                   {{-600, 0, 150},
                                    {-330, 0, 150},
                                    {-330, 0, -200},
                                    {-270, 0, -200},
                                    {-270, 0, 150},
                                    {150, 0, 150},
                                    {152, 0, -246},
                                    {448, 0, -246},
                                    {450, 0, 150},
                                    {600, 0, 150}},
                                   20);
    svg = picture_svg(wide, {{900, vertical_section(wide.domain, last.surface, 0)}}, last,
                      sample_metrics());
    const std::string png = png_of(svg, 2);
    keep("wide", svg, png);
    CHECK(svg.find("times the scale of depths") == std::string::npos);
    CHECK(decode(png).width > decode(png).height);
    CHECK(tall.width < tall.height);
}

TEST_CASE("picture: a hole in full symmetry, with its plan view") {
    Case c = tests::trench_case();
    c.title = "contact hole";
    c.domain.symmetry = geometry::Symmetry::full;
    c.domain.cells_y = 80;
    c.mask.openings[0].shape = geometry::Opening::Shape::round;
    SurfaceState last;
    last.time_s = 120;
    last.surface =
        tests::revolved_hole(c.domain, {{34, 0}, {30, -40}, {31, -100}, {26, -210}, {0, -210}}, 48);
    for (auto& v : last.surface.vertices)
        v.z += 60; // top of the mask at 60 nm
    const Section section = vertical_section(c.domain, last.surface, section_y(c));
    REQUIRE(section.size() == 1);
    double left = 0, right = 0;
    REQUIRE(walls_at(section, 20, 0, left, right));
    // Oracle: the polygon's walls at r = 30 nm; a 48-sided ring lies between 30 cos(pi/48) and 30.
    // Source: derived here. Tolerance: that.
    CHECK(right <= 30 + 1e-9);
    CHECK(right >= 30 * std::cos(3.14159265 / 48) - 1e-9);
    CHECK(left == Approx(-right));
    const Section plan = horizontal_section(last.surface, 10);
    REQUIRE(plan.size() == 1);
    CHECK(plan[0].closed);
    const std::string svg = picture_svg(c, {{0, section}, {120, section}}, last, sample_metrics());
    CHECK(svg.find("Plan view") != std::string::npos);
    keep("hole", svg, png_of(svg, 2));
}

TEST_CASE("palette: materials stay apart in grey and by hatch") {
    const std::vector<std::string> materials = {"Si",
                                                "SiO2",
                                                "resist",
                                                "Si3N4",
                                                "amorphous carbon",
                                                "W",
                                                "fluorocarbon polymer",
                                                "something else"};
    const auto looks = material_looks(materials);
    std::set<std::string> colours;
    std::set<int> hatches;
    std::vector<double> greys;
    for (const auto& look : looks) {
        colours.insert(look.colour);
        hatches.insert(look.hatch);
        greys.push_back(lightness(look.colour));
    }
    CHECK(colours.size() == 8);
    CHECK(hatches.size() == 8);
    std::sort(greys.begin(), greys.end());
    for (std::size_t i = 1; i < greys.size(); ++i)
        CHECK(greys[i] - greys[i - 1] >= 7);
    // Oracle: L* of white is 100, of #777777 about 50. Source: CIE 1976, from memory. 0.5.
    CHECK(lightness("#ffffff") == Approx(100).margin(0.01));
    CHECK(lightness("#777777") == Approx(50).margin(0.5));
    CHECK(material_looks({"Si", "Si"}).size() == 2);
}

TEST_CASE("picture: sections of a hole's front as the level set gives it") {
    // Oracle: a hole of radius 28 nm through a mask of 60 nm: one line from side to side, one ring
    // in plan, walls at x = -28 and 28. Source: derived here. Tolerance: a tenth of a cell (0.2
    // nm).
    Case c = tests::trench_case();
    c.title = "hole before the etch";
    c.domain.symmetry = geometry::Symmetry::full;
    c.domain.cells_x = c.domain.cells_y = 48;
    c.mask.thickness = 60;
    c.mask.openings[0].shape = geometry::Opening::Shape::round;
    c.mask.openings[0].width_x = c.mask.openings[0].width_y = 56;
    const geometry::Front front(c.domain, geometry::initial_distance(c.domain, c.mask), -8,
                                c.mask.thickness + 8);
    SurfaceState last;
    last.surface = geometry::extract_surface(front);
    const Section section = vertical_section(c.domain, last.surface, section_y(c));
    REQUIRE(section.size() == 1);
    CHECK_FALSE(section[0].closed);
    CHECK(std::fabs(section[0].points.front()[0]) == Approx(48).margin(1e-9));
    CHECK(std::fabs(section[0].points.back()[0]) == Approx(48).margin(1e-9));
    double left = 0, right = 0;
    REQUIRE(walls_at(section, 30, 0, left, right));
    CHECK(left == Approx(-28).margin(0.2));
    CHECK(right == Approx(28).margin(0.2));
    const Section plan = horizontal_section(last.surface, 30);
    REQUIRE(plan.size() == 1);
    CHECK(plan[0].closed);
    const std::string svg = picture_svg(c, {{0, section}}, last, Metrics());
    keep("front", svg, png_of(svg, 1));
}
