// SPDX-License-Identifier: Apache-2.0
#include "engine/history.hpp"
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/profile_csv.hpp"
#include "engine/run_record.hpp"
#include "engine/vtk_files.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <cstring>
#include <glib.h>
#include <nlohmann/json.hpp>
#include <sstream>

using namespace rille;
using namespace rille::engine;
using tests::ScratchFolder;

namespace {

std::vector<std::string> split(const std::string& text, char separator) {
    std::vector<std::string> parts;
    std::istringstream stream(text);
    for (std::string part; std::getline(stream, part, separator);)
        parts.push_back(part);
    if (!text.empty() && text.back() == separator && separator == ',') parts.emplace_back();
    return parts;
}

/// Columns that hold words or numbers of things; every other one must name its unit.
bool has_unit(const std::string& column) {
    for (const char* word : {"step", "material", "film", "chain"})
        if (column == word) return true;
    for (const char* unit :
         {"_nm", "_nm2", "_s", "_deg", "_nm_per_min", "_per_nm2_s", "_1", "_count", "_cells"}) {
        const std::size_t n = std::strlen(unit);
        if (column.size() > n && column.compare(column.size() - n, n, unit) == 0) return true;
    }
    return false;
}

bool well_formed(const std::string& xml) {
    const GMarkupParser parser{};
    GMarkupParseContext* context =
        g_markup_parse_context_new(&parser, GMarkupParseFlags(0), nullptr, nullptr);
    const bool fine = g_markup_parse_context_parse(context, xml.data(), xml.size(), nullptr) &&
                      g_markup_parse_context_end_parse(context, nullptr);
    g_markup_parse_context_free(context);
    return fine;
}

HistoryRow sample_row() {
    HistoryRow row;
    row.time_s = 0.1;
    row.step = "main, first";
    row.highest_rate = 4;
    row.features = {{12.5, 13.0, {60.0, std::nullopt, 61.0}, 170.0}};
    row.rays = 1234567890123;
    return row;
}

} // namespace

TEST_CASE("numbers: shortest text that reads back as the same bits") {
    for (const double value : {0.1, 1.0 / 3, 1e-300, 123456789.123456789, -0.0, 6.02214076e23}) {
        const double back = std::strtod(shortest(value).c_str(), nullptr);
        CHECK(std::memcmp(&back, &value, sizeof value) == 0);
    }
    CHECK(shortest(0.1) == "0.1");
    CHECK(with_error(60.123, 0.34) == "60.1 ± 0.3");
    CHECK(with_error(60.123, 0.12) == "60.12 ± 0.12");
    CHECK(with_error(60.123, 2.4) == "60 ± 2");
    CHECK(with_error(60.123, 1e-4) == "60.12 ± <0.01");
    CHECK(with_error(-0.001, 0) == "0.00");
    CHECK(csv_field("a,\"b\"") == "\"a,\"\"b\"\"\"");
}

TEST_CASE("history.csv: units in every header, one field a column") {
    const Case c = tests::trench_case();
    const auto lines = split(history_csv(c, {sample_row(), HistoryRow()}), '\n');
    REQUIRE(lines.size() == 3);
    const auto columns = split(lines[0], ',');
    for (const std::string& column : columns)
        CHECK(has_unit(column));
    CHECK_FALSE(has_unit("depth")); // the check can fail
    CHECK(lines[1].find("\"main, first\"") != std::string::npos);
    CHECK(lines[1].find("1234567890123") != std::string::npos);
    CHECK(split(lines[2], ',').size() == columns.size()); // the empty row has no quoted comma
    CHECK(split(lines[1], ',').size() == columns.size() + 1);
    // Places are sorted by name: bottom, middle, top; an absent CD is an empty field.
    CHECK(lines[0].find("trench_cd_bottom_nm,trench_cd_middle_nm,trench_cd_top_nm") !=
          std::string::npos);
    CHECK(lines[1].find("12.5,13,60,,61,170,240,0") != std::string::npos);
}

TEST_CASE("profile.csv: a line an element, units, arc length and errors") {
    const Case c = tests::trench_case();
    const SurfaceState state = tests::trench_state(c, 1, 75);
    const auto lines = split(profile_csv(c, state), '\n');
    REQUIRE(lines.size() == state.surface.size() + 1);
    const auto columns = split(lines[0], ',');
    for (const std::string& column : columns)
        CHECK(has_unit(column));
    const auto column = [&](const std::string& name) {
        return std::find(columns.begin(), columns.end(), name) - columns.begin();
    };
    REQUIRE(column("grown_polymer_nm") < static_cast<long>(columns.size()));
    double length = 0;
    for (const double piece : state.surface.area)
        length += piece;
    const auto last = split(lines.back(), ',');
    REQUIRE(last.size() == columns.size());
    CHECK(std::stod(last[column("arc_length_nm")]) ==
          Approx(length - 0.5 * state.surface.area.back()).epsilon(1e-12));
    CHECK(std::stod(last[column("normal_deg")]) == Approx(0).margin(1e-12));
    CHECK(std::stod(last[column("rate_nm_per_min")]) == Approx(246));
    CHECK(last[column("material")] == "resist");
    CHECK(std::stod(last[column("sampling_error_nm")]) > 0);
    CHECK(profile_csv(c, state) == profile_csv(c, state));
}

TEST_CASE("sampling error: eight batches against the closed form") {
    // Oracle: SE^2 = sum w^2 / (8 * 7), half-width t SE with Student's t at 97.5 %, 7 degrees of
    // freedom, t = 2.364624.
    // Source: batch means, derived here; t from tables, from memory.
    // Tolerance: 1e-6 relative, the digits of the table.
    const std::vector<double> w = {0.1, -0.2, 0.3, -0.1, 0.05, -0.25, 0.15, -0.05};
    double sum = 0;
    for (const double x : w)
        sum += x * x;
    const double exact = 2.364624 * std::sqrt(sum / 56);
    CHECK(sampling_error(w) == Approx(exact).epsilon(1e-6));
    CHECK_FALSE(sampling_error(w) == Approx(1.02 * exact).epsilon(1e-6));
    CHECK(sampling_error(std::vector<double>{}) == 0);
    CHECK(sampling_error(std::vector<double>{1}) == 0);
}

TEST_CASE("front files: well formed, and read back bit for bit") {
    const ScratchFolder scratch;
    const Case c = tests::trench_case();
    const SurfaceState state = tests::trench_state(c, 0.7, 0.1 + 0.2);
    const std::string text = vtp_text(c, state);
    CHECK(well_formed(text));
    CHECK_FALSE(well_formed(text.substr(0, text.size() - 12)));
    OutputFolder folder(scratch / "run", OutputFolder::Existing::refuse);
    folder.write("frames/frame_0000.vtp", text);
    const SurfaceState back = read_vtp(c, scratch / "run/frames/frame_0000.vtp");
    CHECK(back.time_s == state.time_s);
    CHECK(back.surface.vertices == state.surface.vertices);
    CHECK(back.surface.corners == state.surface.corners);
    CHECK(back.surface.normal == state.surface.normal);
    CHECK(back.surface.centre == state.surface.centre);
    CHECK(back.surface.area == state.surface.area);
    CHECK(back.surface.next == state.surface.next);
    CHECK(back.material == state.material);
    CHECK(back.grown.thickness == state.grown.thickness);
    CHECK(back.displacement == state.displacement);
    REQUIRE(back.fields.size() == 2);
    CHECK(back.fields[0].name == "ion_flux_Cl2+");
    CHECK(back.fields[0].unit == "per_nm2_s");
    CHECK(back.fields[1].value == state.fields[1].value);
    folder.write("frames/frame_0000.vtp", text.substr(0, text.size() / 2));
    CHECK_THROWS_AS(read_vtp(c, scratch / "run/frames/frame_0000.vtp"), OutputError);
    CHECK_THROWS_AS(read_vtp(c, scratch / "run/none.vtp"), OutputError);
}

TEST_CASE("front files: quads and triangles of a full surface") {
    const ScratchFolder scratch;
    Case c = tests::trench_case();
    c.domain.symmetry = geometry::Symmetry::full;
    c.domain.cells_y = 80;
    SurfaceState state;
    state.surface = tests::revolved_hole(c.domain, {{30, 0}, {30, -100}, {0, -100}}, 24);
    OutputFolder folder(scratch / "run", OutputFolder::Existing::refuse);
    folder.write("hole.vtp", vtp_text(c, state));
    const SurfaceState back = read_vtp(c, scratch / "run/hole.vtp");
    CHECK(back.surface.corners == state.surface.corners);
    CHECK(back.surface.vertices == state.surface.vertices);
    CHECK(well_formed(pvd_text({{0, "frames/a.vtp"}, {12.5, "frames/b.vtp"}})));
    CHECK(pvd_text({{12.5, "frames/b.vtp"}}).find("timestep=\"12.5\"") != std::string::npos);
    CHECK(profile_csv(c, state).find("x_nm,y_nm,z_nm,normal_x_1") == 0);
}

TEST_CASE("run.json: what a result needs to be traced back") {
    Case c = tests::trench_case();
    c.warnings = {"from the case"};
    RunRecord record;
    record.threads = 2;
    record.warnings = {"from the run"};
    record.steps = {{"main", 0, 61.5, "reached stop at trench"}};
    record.rays = 1000;
    record.lost_rays = 1;
    const auto json = record_json(c, record, {"run.json"});
    CHECK(json["warnings"].size() == 2);
    CHECK(json["steps"][0]["duration_s"] == 61.5);
    CHECK(json["numerics"]["lost_share"] == 0.001);
    CHECK(json["parameter_standing"]["illustrative"] == 2);
    CHECK(json["program"]["version"].get<std::string>().size() > 2);
    // Oracle: SHA-256 of "abc". Source: the standard's own example, from memory. Exact.
    CHECK(content_hash("abc") ==
          "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    CHECK(json["case_sha256"] == content_hash(c.resolved_yaml));
    c.resolved_yaml += " ";
    CHECK(record_json(c, record, {})["case_sha256"] != json["case_sha256"]);
    CHECK(standing_line(c) ==
          "parameters: 0 measured, 14 published, 5 from memory, 2 illustrative");
}
