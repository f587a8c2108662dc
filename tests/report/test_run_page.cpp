// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/output_names.hpp"
#include "engine/report/run_page.hpp"
#include "engine/report/section_sheet.hpp"
#include "engine/report/surface_mesh.hpp"
#include "engine/run.hpp"
#include "engine/run_output.hpp"

#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <unistd.h>

using namespace rille;
using namespace rille::engine;
namespace fs = std::filesystem;

namespace {

class Quiet : public RunObserver {
public:
    explicit Quiet(RunOutput& output) : output_(output) {}
    void progressed(const Simulation&, const HistoryRow&, double) override {}
    void framed(const SurfaceState& state) override { output_.add_frame(state); }

private:
    RunOutput& output_;
};

/// A short etch of the example's trench on a coarse grid, with its folder; made once.
struct ShortRun {
    Case c;
    std::string path =
        (fs::temp_directory_path() / ("rille_report_" + std::to_string(getpid()))).string();

    ShortRun()
        : c(load_case(std::string(RILLE_ROOT) + "/examples/poly-trench/case.yaml",
                      {"spacing=16 nm", "sampling.ions_per_species=64", "sampling.rays_per_point=8",
                       "recipe.steps.main.no_longer_than=4 s"})) {
        fs::remove_all(path);
        OutputFolder folder(path, OutputFolder::Existing::refuse);
        RunOutput output(folder, c);
        Quiet observer(output);
        const std::atomic<bool> stop{false};
        output.finish(run_case(c, observer, stop));
    }
    ~ShortRun() { fs::remove_all(path); }
};

const ShortRun& short_run() {
    static const ShortRun run;
    return run;
}

std::vector<std::string> section_ids(const Page& page) {
    std::vector<std::string> ids;
    for (const PageSection& section : page.sections)
        ids.push_back(section.id);
    return ids;
}

bool has(const std::vector<std::string>& list, const std::string& item) {
    return std::find(list.begin(), list.end(), item) != list.end();
}

/// A sheet of n by n quads, 1 nm wide each, with a step of material in its middle.
SurfaceState sheet(int n) {
    SurfaceState state;
    for (int j = 0; j <= n; ++j)
        for (int i = 0; i <= n; ++i)
            state.surface.vertices.push_back({double(i), double(j), 0.1 * i});
    for (int j = 0; j < n; ++j)
        for (int i = 0; i < n; ++i) {
            const int a = j * (n + 1) + i;
            state.surface.corners.push_back({a, a + 1, a + n + 2, a + n + 1});
            state.material.push_back(i < n / 2 ? 0 : 1);
        }
    state.surface.centre.resize(n * n);
    return state;
}

double area(const SurfaceMesh& mesh, int material) {
    double sum = 0;
    for (std::size_t t = 0; t < mesh.triangles.size(); ++t) {
        if (mesh.material[t] != material) continue;
        const auto& [a, b, c] = mesh.triangles[t];
        sum += 0.5 * (mesh.vertices[b] - mesh.vertices[a])
                         .cross(mesh.vertices[c] - mesh.vertices[a])
                         .length();
    }
    return sum;
}

} // namespace

TEST_CASE("the report of a whole run has every part and its numbers", "[run]") {
    const ShortRun& run = short_run();
    const RunFolder folder = read_run_folder(run.path, run.c);
    REQUIRE(folder.has_metrics);
    CHECK(folder.history.rows() > 3);
    const RunReport report = run_report(run.c, folder);
    const std::vector<std::string> ids = section_ids(report.page);
    for (const char* id :
         {"over-time", "curves", "arrivals", "measured", "cost", "warnings", "case", "origin"}) {
        INFO(id);
        CHECK(has(ids, id));
    }
    CHECK(!has(ids, "surface")); // of `full` results only
    const std::string html = page_html(report.page);
    CHECK(html.size() < 2000000);
    const Metric* depth = folder.metrics.find("depth centre");
    REQUIRE(depth);
    REQUIRE(depth->value);
    CHECK(html.find(std::to_string(*depth->value).substr(0, 5)) != std::string::npos);
    // The same folder gives the same page.
    CHECK(page_html(run_report(run.c, read_run_folder(run.path, run.c)).page) == html);
}

TEST_CASE("metrics read back are those that were written", "[run]") {
    const ShortRun& run = short_run();
    const RunFolder folder = read_run_folder(run.path, run.c);
    std::ifstream file(run.path + "/" + output_names::metrics);
    const auto written = nlohmann::json::parse(file);
    nlohmann::json again = metrics_json(run.c, folder.metrics);
    CHECK(again == written);
    again["metrics"][0]["value"] = 1; // the comparison sees a fault
    CHECK(again != written);
}

TEST_CASE("a folder that holds part of a run has a report", "[run]") {
    const ShortRun& run = short_run();
    const std::string part = run.path + "_part";
    fs::remove_all(part);
    fs::copy(run.path, part, fs::copy_options::recursive);
    for (const char* name : {output_names::record, output_names::metrics, output_names::history})
        fs::remove(fs::path(part) / name);
    const RunFolder folder = read_run_folder(part, run.c);
    CHECK(folder.has_metrics); // measured on the last frame
    CHECK(folder.record.is_null());
    const std::string html = page_html(run_report(run.c, folder).page);
    CHECK(html.find("Not finished.") != std::string::npos);
    fs::remove_all(fs::path(part) / output_names::frames);
    const RunFolder bare = read_run_folder(part, run.c);
    CHECK(!bare.has_metrics);
    CHECK(page_html(run_report(run.c, bare).page).find("Nothing has been measured") !=
          std::string::npos);
    std::ofstream(part + "/" + output_names::record) << "{\"status\": ";
    CHECK_THROWS_AS(read_run_folder(part, run.c), OutputError);
    fs::remove_all(part);
}

TEST_CASE("a history is read by the names of its columns", "[run]") {
    const HistoryTable table = history_table("time_s,step,a_nm\n0.5,main,\n1,main,3.25\n");
    REQUIRE(table.rows() == 2);
    REQUIRE(table.find("a_nm"));
    CHECK(std::isnan((*table.find("a_nm"))[0]));
    CHECK((*table.find("a_nm"))[1] == 3.25);
    CHECK(table.find("b_nm") == nullptr);
    CHECK(history_table("").rows() == 0);
}

TEST_CASE("lines are thinned within their tolerance", "[run]") {
    std::vector<std::array<double, 2>> circle;
    for (int i = 0; i <= 1000; ++i)
        circle.push_back({std::cos(i * 0.002 * M_PI), std::sin(i * 0.002 * M_PI)});
    const auto light = thinned(circle, 1e-3);
    CHECK(light.size() == 129); // 64 chords leave the circle by 1.2e-3, 128 by 0.3e-3
    CHECK(light.front() == circle.front());
    CHECK(light.back() == circle.back());
    for (const auto& p : circle) { // no point is farther from the line than allowed
        double nearest = 10;
        for (std::size_t i = 0; i + 1 < light.size(); ++i) {
            const double dx = light[i + 1][0] - light[i][0], dy = light[i + 1][1] - light[i][1];
            const double along = std::clamp(
                ((p[0] - light[i][0]) * dx + (p[1] - light[i][1]) * dy) / (dx * dx + dy * dy), 0.0,
                1.0);
            nearest = std::min(nearest, std::hypot(p[0] - light[i][0] - along * dx,
                                                   p[1] - light[i][1] - along * dy));
        }
        REQUIRE(nearest <= 1.001e-3);
    }
}

TEST_CASE("a mesh for the viewer keeps its area and materials when it is made lighter", "[run]") {
    const SurfaceState state = sheet(60);
    const SurfaceMesh whole = surface_mesh(state, 1, 60000);
    CHECK(whole.edge_nm == 0);
    CHECK(whole.vertices.size() == 61 * 61);
    CHECK(whole.triangles.size() == 2 * 60 * 60);
    const SurfaceMesh light = surface_mesh(state, 1, 1000);
    CHECK(light.vertices.size() <= 1000);
    CHECK(light.vertices.size() > 300);
    CHECK(light.edge_nm >= 1.5);
    for (const int material : {0, 1})
        CHECK(area(light, material) == Approx(area(whole, material)).epsilon(0.1));
}

TEST_CASE("a slide is 1920 by 1080 and holds the drawing whole", "[run]") {
    const std::string slide = slide_of("<?xml version=\"1.0\"?>\n<svg width=\"100\" height=\"200\" "
                                       "viewBox=\"0 0 100 200\"><title>x</title></svg>");
    CHECK(slide.find("width=\"1920\" height=\"1080\"") != std::string::npos);
    CHECK(slide.find("<svg x=\"690\" y=\"0\" width=\"540\" height=\"1080\"") != std::string::npos);
}
