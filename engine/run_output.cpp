// SPDX-License-Identifier: Apache-2.0
#include "engine/run_output.hpp"

#include "engine/case.hpp"
#include "engine/output_names.hpp"
#include "engine/profile_csv.hpp"
#include "engine/sheath_output.hpp"

#include <algorithm>
#include <fmt/format.h>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

constexpr double png_scale = 2;

std::string json_text(const nlohmann::json& json) {
    return json.dump(2) + "\n";
}

} // namespace

RunOutput::RunOutput(OutputFolder& folder, const Case& c) : folder_(folder), case_(c) {
    for (const InputFile& file : c.inputs)
        folder_.write(file.name, file.content);
    folder_.write(output_names::resolved_case, c.resolved_yaml);
}

RunOutput::RunOutput(OutputFolder& folder, const Case& c, const std::vector<SeriesEntry>& frames)
    : RunOutput(folder, c) {
    for (const SeriesEntry& frame : frames) {
        const SurfaceState state = read_vtp(c, folder_.path() + "/" + frame.file);
        fronts_.push_back({frame.time_s, vertical_section(c.domain, state.surface, section_y(c))});
        series_.push_back(frame);
        folder_.note(frame.file);
    }
    folder_.note(output_names::series);
}

void RunOutput::save(RunState state) {
    state.frames = series_;
    folder_.write(output_names::state, state_text(case_, state));
}

void RunOutput::add_frame(const SurfaceState& state) {
    if (!series_.empty() && state.time_s <= series_.back().time_s) {
        series_.pop_back(); // a later view of the same instant replaces the earlier one
        fronts_.pop_back();
    }
    const std::string file =
        fmt::format("{}/frame_{:04}.vtp", output_names::frames, series_.size());
    folder_.write(file, vtp_text(case_, state));
    series_.push_back({state.time_s, file});
    folder_.write(output_names::series, pvd_text(series_));
    fronts_.push_back(
        {state.time_s, vertical_section(case_.domain, state.surface, section_y(case_))});
}

Metrics RunOutput::finish(const RunResult& result) {
    if (series_.empty() || result.last.time_s > series_.back().time_s) add_frame(result.last);
    folder_.write(output_names::history, history_csv(case_, result.history));
    folder_.write(output_names::profile, profile_csv(case_, result.last));
    Metrics metrics = measure(case_, result.last);
    folder_.write(output_names::metrics, json_text(metrics_json(case_, metrics)));
    if (!metrics.comparison.contours.empty())
        folder_.write(output_names::comparison, comparison_csv(case_, metrics.comparison));
    if (result.write_level_set) folder_.write_with(output_names::level_set, result.write_level_set);
    if (result.record.status == "done" || result.record.status == "not cleared")
        folder_.remove(output_names::state);
    const std::string picture = picture_svg(case_, fronts_, result.last, metrics);
    folder_.write(output_names::picture_svg, picture);
    folder_.write(output_names::picture_png, png_of(picture, png_scale));
    write_sheath(folder_, case_, false);
    std::vector<std::string> files = folder_.written();
    files.insert(std::upper_bound(files.begin(), files.end(), output_names::record),
                 output_names::record);
    files.erase(std::unique(files.begin(), files.end()), files.end());
    RunRecord record = result.record;
    if (record.peak_memory_bytes == 0) record.peak_memory_bytes = peak_memory_bytes();
    folder_.write(output_names::record, json_text(record_json(case_, record, files)));
    return metrics;
}

} // namespace rille::engine
