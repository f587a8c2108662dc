// SPDX-License-Identifier: Apache-2.0
#include "engine/run_output.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"
#include "engine/output_names.hpp"
#include "engine/profile_csv.hpp"
#include "engine/shape_output.hpp"
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

RunOutput::RunOutput(OutputFolder& folder, const Case& c, const RunParts& parts)
    : folder_(folder), case_(c), parts_(parts) {
    if (parts_.resolved_case) write_case();
}

RunOutput::RunOutput(OutputFolder& folder, const Case& c, const std::vector<SeriesEntry>& frames,
                     const RunParts& parts)
    : RunOutput(folder, c, parts) {
    for (const SeriesEntry& frame : frames) {
        const SurfaceState state = read_vtp(c, folder_.path() + "/" + frame.file);
        fronts_.push_back({frame.time_s, vertical_section(c.domain, state.surface, section_y(c))});
        series_.push_back(frame);
        folder_.note(frame.file);
    }
    if (!frames.empty()) folder_.note(output_names::series);
}

void RunOutput::write_case() {
    for (const InputFile& file : case_.inputs)
        folder_.write(file.name, file.content);
    folder_.write(output_names::resolved_case, case_.resolved_yaml);
}

void RunOutput::save(RunState state) {
    state.frames = series_;
    folder_.write(output_names::state, state_text(case_, state));
}

void RunOutput::add_frame(const SurfaceState& state) {
    if (!parts_.frames) {
        if (parts_.pictures)
            fronts_.push_back(
                {state.time_s, vertical_section(case_.domain, state.surface, section_y(case_))});
        return;
    }
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

void RunOutput::add_arc_data(const SurfaceFlux& flux) {
    folder_.write(fmt::format("{}/{}s.csv", output_names::arc_data, shortest(flux.state.time_s)),
                  flux_csv(case_, flux));
}

void RunOutput::write_pictures(const RunResult& result, const Metrics& metrics) {
    const std::string picture = picture_svg(case_, fronts_, result.last, metrics);
    folder_.write(output_names::picture_svg, picture);
    folder_.write(output_names::picture_png, png_of(picture, png_scale));
    if (!result.shape.empty()) {
        folder_.write(output_names::causes, causes_csv(case_, result.shape));
        const std::string causes = cause_picture_svg(case_, result.last, result.shape);
        folder_.write(output_names::causes_svg, causes);
        folder_.write(output_names::causes_png, png_of(causes, png_scale));
    }
    write_sheath(folder_, case_, false);
}

void RunOutput::remove_frames() {
    for (const SeriesEntry& frame : series_)
        folder_.remove(frame.file);
    folder_.remove(output_names::series);
    folder_.remove(output_names::frames);
    series_.clear();
}

void RunOutput::write_record(const RunResult& result) {
    std::vector<std::string> files = folder_.written();
    files.insert(std::upper_bound(files.begin(), files.end(), output_names::record),
                 output_names::record);
    files.erase(std::unique(files.begin(), files.end()), files.end());
    RunRecord record = result.record;
    if (record.peak_memory_bytes == 0) record.peak_memory_bytes = peak_memory_bytes();
    folder_.write(output_names::record, json_text(record_json(case_, record, files)));
}

Metrics RunOutput::finish(const RunResult& result, const RunParts& parts) {
    if (parts_.frames && (series_.empty() || result.last.time_s > series_.back().time_s))
        add_frame(result.last);
    if (parts.resolved_case && !parts_.resolved_case) write_case();
    if (parts.history) folder_.write(output_names::history, history_csv(case_, result.history));
    if (parts.profile) folder_.write(output_names::profile, profile_csv(case_, result.last));
    Metrics metrics =
        measure(case_, result.last, result.after, is_at_its_end(result.record.status));
    if (grids_ && metrics.is_final) grids_->assess(case_, metrics);
    folder_.write(output_names::metrics, json_text(metrics_json(case_, metrics)));
    if (parts.profile && !metrics.comparison.contours.empty())
        folder_.write(output_names::comparison, comparison_csv(case_, metrics.comparison));
    if (parts.level_set && result.write_level_set)
        folder_.write_with(output_names::level_set, result.write_level_set);
    if (metrics.is_final) folder_.remove(output_names::state);
    if (parts.pictures) write_pictures(result, metrics);
    if (!parts.frames) remove_frames();
    if (parts.record) write_record(result);
    return metrics;
}

} // namespace rille::engine
