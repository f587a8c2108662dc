// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/metrics.hpp"
#include "engine/run_result.hpp"

#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// history.csv as columns, so far as it can be read.
struct HistoryTable {
    std::vector<std::string> names;
    std::vector<std::vector<double>> values; ///< per name; NaN where a cell holds no number

    std::size_t rows() const { return values.empty() ? 0 : values.front().size(); }
    /// Null if there is no such column.
    const std::vector<double>* find(const std::string& name) const;
};

/// What a run left in its folder; a run that was killed or kept little leaves part of it.
struct RunFolder {
    std::string path;
    std::vector<std::string> frames; ///< paths of frames/*.vtp in order of time
    nlohmann::json record;           ///< run.json; null where there is none
    Metrics metrics;                 ///< of metrics.json, else measured on the last frame
    bool has_metrics = false;        ///< neither is there where false
    HistoryTable history;
    bool can_be_resumed = false; ///< a saved state is there

    /// The run was stopped or failed before the end of its recipe, or is still going on.
    bool is_stopped() const;
};

/// Reads all of it but the frames. Throws OutputError where a file is there but no such file.
RunFolder read_run_folder(const std::string& path, const Case&);

/// The frames of a run in order of time; empty if there are none.
std::vector<std::string> frame_files(const std::string& folder);
/// run.json; null where there is none. Throws OutputError for anything else.
nlohmann::json run_record(const std::string& folder);
/// What the frames show of the ends of the steps that targets name; a step whose end none of them
/// shows is left out.
std::vector<StepMetrics> measured_after(const Case&, const std::vector<std::string>& frames,
                                        const nlohmann::json& record);
/// What metrics_json wrote. Throws nlohmann::json::exception for anything else.
Metrics metrics_from_json(const nlohmann::json&);
HistoryTable history_table(const std::string& csv);

} // namespace rille::engine
