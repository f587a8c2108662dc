// SPDX-License-Identifier: Apache-2.0
#include "engine/run_state.hpp"

#include "engine/case.hpp"
#include "engine/output_folder.hpp"
#include "engine/state_archive.hpp"
#include "engine/version.hpp"

namespace rille::engine {
namespace {

const std::string mark = "rille state 3\n";

template <class Archive, class Row>
void visit_row(Archive& archive, Row& row) {
    archive(row.time_s);
    archive(row.step);
    archive(row.step_time_s);
    archive(row.time_step_s);
    archive(row.sub_steps);
    archive(row.highest_rate);
    archive(row.lowest_rate);
    archive(row.elements);
    archive(row.iterations);
    archive(row.residual);
    archive(row.largest_move);
    archive(row.redistance_shift);
    archive(row.rays);
    archive(row.lost_rays);
    for (auto& feature : row.features) {
        archive(feature.depth_centre);
        archive(feature.depth_deepest);
        archive(feature.cd);
        archive(feature.mask_left);
    }
}

void visit_size(StateWriter& archive, const std::vector<Metric>& list) {
    archive(list.size());
}
void visit_size(StateReader& archive, std::vector<Metric>& list) {
    std::size_t size = 0;
    archive(size);
    list.resize(size);
}

template <class Archive, class Step>
void visit_step(Archive& archive, Step& after) {
    archive(after.step);
    archive(after.time_s);
    visit_size(archive, after.metrics);
    for (auto& metric : after.metrics) {
        archive(metric.name);
        archive(metric.feature);
        archive(metric.value);
        archive(metric.unit);
        archive(metric.sampling_error);
        archive(metric.definition);
        archive(metric.note);
    }
}

template <class Archive, class State>
void visit_state(Archive& archive, State& state) {
    archive(state.simulation);
    archive(state.next_frame_s);
    archive(state.wall_seconds);
    archive(state.program);
    archive(state.resumed);
    for (auto& frame : state.frames) {
        archive(frame.time_s);
        archive(frame.file);
    }
    for (auto& row : state.history)
        visit_row(archive, row);
    for (auto& after : state.after)
        visit_step(archive, after);
}

} // namespace

std::string this_program() {
    return version() + " " + revision() + " " + build_info();
}

std::string case_hash(const Case& c) {
    std::string all = c.resolved_yaml;
    for (const InputFile& file : c.inputs)
        all += file.name + "\n" + file.content;
    return content_hash(all);
}

std::string state_text(const Case& c, const RunState& state) {
    StateWriter archive;
    archive(case_hash(c));
    archive(c.mask.openings.size());
    archive(state.history.size());
    archive(state.frames.size());
    archive(state.after.size());
    visit_state(archive, state);
    return mark + content_hash(archive.text()) + "\n" + archive.text();
}

RunState read_state(const Case& c, const std::string& text, const std::string& path) {
    const std::size_t hash = mark.size(), body = hash + 65;
    const auto wrong = [&](const std::string& reason) {
        return OutputError(path, "cannot take up the run", reason);
    };
    if (text.compare(0, mark.size(), mark) != 0 || text.size() < body)
        throw wrong("this is not a saved state of this version");
    if (text.compare(hash, 64, content_hash(text.substr(body))) != 0)
        throw wrong("the file is damaged");
    StateReader archive(std::string_view(text).substr(body));
    std::string of_case;
    std::size_t features = 0, rows = 0, frames = 0, steps = 0;
    archive(of_case);
    if (of_case != case_hash(c)) throw wrong("the case beside it was changed since");
    archive(features);
    archive(rows);
    archive(frames);
    archive(steps);
    RunState state;
    state.frames.resize(frames);
    state.history.resize(rows);
    state.after.resize(steps);
    for (HistoryRow& row : state.history)
        row.features.resize(features);
    visit_state(archive, state);
    return state;
}

} // namespace rille::engine
