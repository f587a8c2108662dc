// SPDX-License-Identifier: Apache-2.0
#include "engine/report/run_folder.hpp"

#include "engine/case.hpp"
#include "engine/csv_rows.hpp"
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"
#include "engine/run_record.hpp"
#include "engine/run_state.hpp"
#include "engine/vtk_files.hpp"

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <limits>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using nlohmann::json;

constexpr double same_time = 1e-9; // share by which times of one instant may differ

Verdict verdict_of(const std::string& word) {
    for (const Verdict verdict : {Verdict::met, Verdict::missed})
        if (word == verdict_name(verdict)) return verdict;
    return Verdict::undecided;
}

/// The file as JSON, null if it is not there.
json read_json(const std::string& path) {
    if (!fs::exists(path)) return nullptr;
    try {
        return json::parse(read_file(path));
    } catch (const json::exception& error) {
        throw OutputError(path, "reading a result", error.what());
    }
}

double number_or_nan(const std::string& text) {
    char* end = nullptr;
    const double value = std::strtod(text.c_str(), &end);
    return end != text.c_str() && *end == '\0' ? value : std::numeric_limits<double>::quiet_NaN();
}

std::vector<Metric> list_from_json(const json& written) {
    std::vector<Metric> metrics;
    for (const json& m : written) {
        Metric metric{m.at("name"), m.at("feature"), {}, m.at("unit"), 0, "", ""};
        if (!m.at("value").is_null()) metric.value = m.at("value").get<double>();
        if (m.at("sampling_error").is_number()) metric.sampling_error = m.at("sampling_error");
        if (m.at("grid_error").is_number()) metric.grid_error = m.at("grid_error").get<double>();
        metric.definition = m.value("definition", "");
        metric.note = m.value("note", "");
        metrics.push_back(metric);
    }
    return metrics;
}

TargetVerdict verdict_from_json(const json& t) {
    TargetVerdict verdict;
    verdict.target = t.at("target");
    verdict.metric = t.at("metric");
    verdict.feature = t.at("feature");
    verdict.verdict = verdict_of(t.at("verdict"));
    verdict.by_numbers = verdict_of(t.at("by_numbers"));
    verdict.reason = t.at("reason");
    verdict.after = t.at("after");
    if (t.at("value").is_number()) verdict.value = t.at("value").get<double>();
    verdict.sampling_error = t.at("sampling_error");
    verdict.unit = t.at("unit");
    return verdict;
}

void read_metrics(RunFolder& folder, const Case& c) {
    const std::string path = (fs::path(folder.path) / output_names::metrics).string();
    const json written = read_json(path);
    folder.has_metrics = true;
    if (!written.is_null()) {
        try {
            folder.metrics = metrics_from_json(written);
        } catch (const json::exception& error) {
            throw OutputError(path, "reading the metrics of a run", error.what());
        }
    } else if (!folder.frames.empty()) {
        folder.metrics =
            measure(c, read_vtp(c, folder.frames.back()),
                    measured_after(c, folder.frames, folder.record), !folder.is_stopped());
    } else {
        folder.has_metrics = false;
    }
}

/// A run that was killed has its history in the state from which it can be taken up.
void read_history(RunFolder& folder, const Case& c) {
    const fs::path history = fs::path(folder.path) / output_names::history;
    if (fs::exists(history)) {
        folder.history = history_table(read_file(history.string()));
    } else if (folder.can_be_resumed) {
        const std::string path = (fs::path(folder.path) / output_names::state).string();
        try {
            folder.history =
                history_table(history_csv(c, read_state(c, read_file(path), path).history));
        } catch (const OutputError&) { // of another version or another case: nothing to show
        }
    }
}

} // namespace

bool RunFolder::is_stopped() const {
    if (!record.is_object()) return can_be_resumed;
    return !is_at_its_end(record.value("status", ""));
}

const std::vector<double>* HistoryTable::find(const std::string& name) const {
    for (std::size_t i = 0; i < names.size(); ++i)
        if (names[i] == name) return &values[i];
    return nullptr;
}

RunFolder read_run_folder(const std::string& path, const Case& c) {
    RunFolder folder;
    folder.path = path;
    folder.frames = frame_files(path);
    folder.record = run_record(path);
    folder.can_be_resumed =
        fs::exists(fs::path(path) / output_names::state) ||
        (folder.record.is_null() && fs::exists(fs::path(path) / output_names::grids));
    read_metrics(folder, c);
    read_history(folder, c);
    return folder;
}

std::vector<std::string> frame_files(const std::string& folder) {
    std::vector<std::string> files;
    std::error_code missing;
    const fs::path frames = fs::path(folder) / output_names::frames;
    for (const auto& entry : fs::directory_iterator(frames, missing))
        if (entry.path().extension() == ".vtp") files.push_back(entry.path().string());
    std::sort(files.begin(), files.end(), [](const std::string& a, const std::string& b) {
        return a.size() != b.size() ? a.size() < b.size() : a < b; // numbers may outgrow 4 digits
    });
    return files;
}

std::vector<StepMetrics> measured_after(const Case& c, const std::vector<std::string>& frames,
                                        const json& record) {
    std::vector<StepMetrics> steps;
    if (record.is_null()) return steps;
    for (const json& step : record.value("steps", json::array())) {
        const std::string name = step.at("name");
        const double end_s = step.at("end_s");
        if (!is_measured_after(c, name)) continue;
        for (const std::string& frame : frames) {
            const SurfaceState state = read_vtp(c, frame);
            if (std::abs(state.time_s - end_s) > same_time * end_s) continue;
            steps.push_back(measure_after(c, state, name));
            break;
        }
    }
    return steps;
}

json run_record(const std::string& folder) {
    return read_json((fs::path(folder) / output_names::record).string());
}

Metrics metrics_from_json(const json& written) {
    Metrics metrics;
    metrics.time_s = written.at("time_s");
    metrics.is_final = written.value("final", true);
    metrics.metrics = list_from_json(written.at("metrics"));
    for (const json& step : written.value("after_steps", json::array()))
        metrics.after.push_back(
            {step.at("step"), step.at("time_s"), list_from_json(step.at("metrics"))});
    for (const json& t : written.at("targets"))
        metrics.targets.push_back(verdict_from_json(t));
    for (const json& film : written.at("clearing"))
        metrics.clearing.push_back(
            {film.at("feature"), film.at("film"), film.at("cleared"), film.at("remaining_nm")});
    return metrics;
}

HistoryTable history_table(const std::string& csv) {
    HistoryTable table;
    const CsvRows rows = split_csv(csv, "history");
    if (rows.rows.empty()) return table;
    for (const CsvCell& name : rows.rows.front())
        table.names.push_back(name.text);
    table.values.resize(table.names.size());
    for (std::size_t r = 1; r < rows.rows.size(); ++r) {
        const CsvRow& row = rows.rows[r]; // empty cells at its end may be missing
        if (row.size() > table.names.size()) continue;
        for (std::size_t i = 0; i < table.names.size(); ++i)
            table.values[i].push_back(number_or_nan(i < row.size() ? row[i].text : ""));
    }
    return table;
}

} // namespace rille::engine
