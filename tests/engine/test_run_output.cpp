// SPDX-License-Identifier: Apache-2.0
#include "engine/output_names.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run_output.hpp"
#include "geometry/check.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <fstream>
#include <nlohmann/json.hpp>

using namespace rille;
using namespace rille::engine;
using tests::ScratchFolder;

namespace {

RunResult sample_result(const Case& c, double share, double time_s) {
    RunResult result;
    result.last = tests::trench_state(c, share, time_s);
    HistoryRow row;
    row.time_s = time_s;
    measure_row(c, result.last.surface, row);
    result.history = {row};
    ShapePart wall;
    wall.face = ShapePart::Face::left_wall;
    const std::size_t amounts = fluxes::cause_count + fluxes::ion_paths + 1;
    for (const double z : {-20.0, -40.0})
        wall.places.push_back({z, 1, 30, 31 + share, std::vector<double>(amounts, 0.08)});
    result.shape = {wall};
    result.write_level_set = [](const std::string& path) { std::ofstream(path) << "grid"; };
    return result;
}

} // namespace

TEST_CASE("run output: the folder is valid after every call, and complete at the end") {
    const ScratchFolder scratch;
    const Case c = tests::trench_case();
    OutputFolder folder(scratch / "run", OutputFolder::Existing::refuse);
    RunOutput output(folder, c);
    CHECK(read_file(scratch / "run/case.yaml") == c.resolved_yaml);
    output.add_frame(tests::trench_state(c, 0, 0));
    output.add_frame(tests::trench_state(c, 0.5, 30));
    output.add_frame(tests::trench_state(c, 0.5, 30)); // the same instant again: one frame
    const std::string half = read_file(scratch / "run/front.pvd");
    CHECK(half.find("timestep=\"0\"") != std::string::npos);
    CHECK(half.find("timestep=\"30\"") != std::string::npos);

    const Metrics metrics = output.finish(sample_result(c, 1, 75));
    const std::string series = read_file(scratch / "run/front.pvd");
    CHECK(series.find("frame_0002.vtp") != std::string::npos); // the end became a frame
    const auto record = nlohmann::json::parse(read_file(scratch / "run/run.json"));
    for (const char* name : output_names::all) {
        CHECK(std::filesystem::exists(scratch / (std::string("run/") + name)));
        CHECK(record["files"].dump().find(name) != std::string::npos);
    }
    CHECK(record["files"].size() == 14 + 3);
    const auto json = nlohmann::json::parse(read_file(scratch / "run/metrics.json"));
    CHECK(json["metrics"].size() == metrics.metrics.size());
    for (const auto& metric : json["metrics"]) {
        CHECK(metric["grid_error"] == "not assessed");
        CHECK(metric["definition"].get<std::string>().size() > 10);
    }
    // What the series names can be measured again, with the same numbers.
    const Metrics again = measure(c, read_vtp(c, scratch / "run/frames/frame_0002.vtp"));
    CHECK(metrics_json(c, again) == json);
    output.finish(sample_result(c, 1, 75));
    CHECK(read_file(scratch / "run/front.pvd") == series); // and finishing twice adds nothing
}

TEST_CASE("run output: the same run writes the same bytes") {
    const ScratchFolder scratch;
    const Case c = tests::trench_case();
    for (const char* name : {"a", "b"}) {
        OutputFolder folder(scratch / name, OutputFolder::Existing::refuse);
        RunOutput output(folder, c);
        output.add_frame(tests::trench_state(c, 0, 0));
        output.finish(sample_result(c, 0.8, 60));
    }
    for (const char* name :
         {output_names::profile, output_names::history, output_names::metrics, output_names::series,
          output_names::picture_svg, output_names::causes, output_names::causes_svg})
        CHECK(read_file(scratch / (std::string("a/") + name)) ==
              read_file(scratch / (std::string("b/") + name)));
}

TEST_CASE("run output: state of the elements from the step solved on them") {
    Case c = tests::trench_case();
    SurfaceState state;
    state.surface = tests::etched_trench(c.domain, 1);
    const std::size_t n = state.surface.size();
    state.grown.material = {3};
    state.grown.thickness.assign(1, std::vector<double>(n, 0.0));
    state.grown.thickness[0][n / 2] = 0.4;
    fluxes::SurfaceStep step;
    step.response.resize(n);
    for (auto& response : step.response)
        response.rate = 2;
    step.ion_flux.assign(1, std::vector<double>(n, 60.0));
    step.neutral.assign(1, std::vector<double>(n, 900.0));
    fill_state(state, c, step);
    CHECK(state.material[0] == 0);
    CHECK(state.material[n / 2] == 3); // the polymer on top of what the film is
    CHECK(state.film[n / 2] == 2);     // the floor lies in the stop
    REQUIRE(state.fields.size() >= 2);
    CHECK(state.fields[0].name == "ion_flux_Cl2+");
    CHECK(state.fields[1].name == "neutral_flux_Cl");
    CHECK(profile_csv(c, state).find("rate_by_sputtering_nm_per_min") != std::string::npos);
    step.response.pop_back();
    CHECK_THROWS_AS(fill_state(state, c, step), InternalError);
}
