// SPDX-License-Identifier: Apache-2.0
// results.csv from the folders of the points.
#include "engine/study/results.hpp"

#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/point_record.hpp"
#include "engine/study/results_columns.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <filesystem>
#include <fmt/format.h>
#include <fstream>
#include <map>
#include <nlohmann/json.hpp>
#include <unistd.h>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using nlohmann::json;

constexpr std::size_t most_failures_told = 10;

bool is_result(const std::string& status) {
    return status == study_names::done || status == study_names::not_cleared ||
           status == study_names::clogged;
}

void count(StudyCounts& counts, const std::string& status) {
    if (status == study_names::done) ++counts.done;
    if (status == study_names::not_cleared) ++counts.not_cleared;
    if (status == study_names::clogged) ++counts.clogged;
    if (status == study_names::failed) ++counts.failed;
    if (status == study_names::killed) ++counts.killed;
}

std::string one_line(std::string text) {
    std::replace(text.begin(), text.end(), '\n', ' ');
    std::replace(text.begin(), text.end(), '\r', ' ');
    return text;
}

/// Columns that points bring, in the order of their first appearance.
struct FoundColumns {
    std::vector<StudyTableColumn> columns;
    std::map<std::string, std::size_t> known;

    std::size_t place(const StudyTableColumn& column) {
        const auto [at, is_new] = known.emplace(column.name, columns.size());
        if (is_new) columns.push_back(column);
        return at->second;
    }
};

void put(std::vector<std::string>& cells, std::size_t at, const std::string& text) {
    if (cells.size() <= at) cells.resize(at + 1);
    cells[at] = text;
}

std::string joined(const std::vector<std::string>& cells) {
    std::string text;
    for (std::size_t i = 0; i < cells.size(); ++i)
        text += (i ? "," : "") + cells[i];
    return text;
}

/// Goes over the points once. Rows wait in a file, in three parts, since a later point may bring a
/// metric that earlier ones do not have.
class ResultsWriter {
public:
    ResultsWriter(const std::string& folder, const Study& study)
        : folder_(folder), study_(study), several_(study.base.mask.openings.size() > 1),
          rows_path_((fs::path(folder) / (std::string(".") + study_names::results + ".rows." +
                                          host_name() + "." + std::to_string(getpid())))
                         .string()) {}
    ~ResultsWriter() {
        std::error_code ignored;
        fs::remove(rows_path_, ignored);
    }

    StudyResults write() {
        results_.counts.points = study_.points;
        collect();
        if (cpu_kinds_.size() > 1)
            results_.warnings.push_back(fmt::format(
                "points were made on {} kinds of processors, whose results agree to about 1e-9 "
                "but not bit for bit",
                cpu_kinds_.size()));
        OutputFolder out(folder_, OutputFolder::Existing::keep);
        out.write_with(study_names::results, [&](const std::string& path) { assemble(path); });
        return results_;
    }

private:
    void collect() {
        std::ofstream rows(rows_path_, std::ios::binary);
        for (std::size_t index = 0; index < study_.points; ++index) {
            const std::string name = point_name(study_, index);
            if (PointFolder::is_finished(folder_, name)) rows << row(index, name);
        }
        if (!rows.flush())
            throw OutputError(rows_path_, "cannot write the file", "the disk may be full");
    }

    std::string row(std::size_t index, const std::string& name) {
        const fs::path point = PointFolder::final_path(folder_, name);
        const std::string path = (point / study_names::point_record).string();
        const PointRecord record = read_point_record(read_file(path), path);
        count(results_.counts, record.status);
        if (!is_result(record.status) && results_.failures.size() < most_failures_told)
            results_.failures.push_back({name, record.status, one_line(record.failure)});
        if (!record.cpu_features_hash.empty()) cpu_kinds_[record.cpu_features_hash] = true;
        std::vector<std::string> metrics, targets;
        std::string grid_error = "not assessed";
        if (is_result(record.status) && add_metrics(point, metrics, targets))
            grid_error = "assessed";
        return joined(front(index, record)) + '\x1e' + joined(metrics) + '\x1e' + joined(targets) +
               '\x1e' + grid_error + '\x1e' + joined(back(record)) + '\n';
    }

    std::vector<std::string> front(std::size_t index, const PointRecord& record) const {
        std::vector<std::string> cells{record.name, record.status};
        for (const StudyValue& value : study_point(study_, index).values)
            cells.push_back(value.number ? shortest(*value.number)
                                         : csv_field(one_line(value.text)));
        return cells;
    }

    std::vector<std::string> back(const PointRecord& record) const {
        std::vector<std::string> cells;
        for (const fluxes::Standing standing :
             {fluxes::Standing::measured, fluxes::Standing::published,
              fluxes::Standing::from_memory, fluxes::Standing::illustrative}) {
            const auto found = record.standing.find(standing);
            cells.push_back(found == record.standing.end() ? "" : std::to_string(found->second));
        }
        cells.push_back(std::to_string(record.warnings.size()));
        cells.push_back(csv_field(one_line(record.failure)));
        cells.push_back(fmt::format("{:.3f}", record.seconds));
        return cells;
    }

    /// Whether any metric has a grid error.
    bool add_metrics(const fs::path& point, std::vector<std::string>& metrics,
                     std::vector<std::string>& targets) {
        bool any_grid_error = false;
        const std::string path = (point / output_names::metrics).string();
        try {
            const json in = json::parse(read_file(path));
            for (const json& metric : in.at("metrics"))
                any_grid_error |= add_metric(metric, metrics);
            for (const json& target : in.at("targets"))
                add_target(target, metrics, targets);
        } catch (const json::exception& error) {
            throw OutputError(path, "cannot read the metrics of a point", error.what());
        }
        return any_grid_error;
    }

    /// The verdict; of a value at the end of a step the value too, which no metric column holds.
    void add_target(const json& target, std::vector<std::string>& metrics,
                    std::vector<std::string>& targets) {
        std::string name = target.at("metric");
        const std::string after = target.value("after", "");
        if (!after.empty()) {
            json value = target;
            value["name"] = name += " after " + after;
            value["definition"] = "as it stood at the end of step " + after;
            value["grid_error"] = nullptr;
            if (!value.at("unit").get<std::string>().empty()) add_metric(value, metrics);
        }
        put(targets, targets_.place(target_column(name, target.at("feature"), several_)),
            target.at("verdict"));
    }

    bool add_metric(const json& metric, std::vector<std::string>& cells) {
        const StudyTableColumn column =
            metric_column(metric.at("name"), metric.at("feature"), metric.at("unit"), several_,
                          metric.value("definition", ""));
        const std::size_t at = metrics_.place(column);
        metrics_.place(error_column(column, several_));
        const json& value = metric.at("value");
        put(cells, at + 1, "");
        if (!value.is_number()) return false;
        cells[at] = shortest(value.get<double>() + 0.0); // no -0
        cells[at + 1] = shortest(metric.value("sampling_error", 0.0));
        const json bound = metric.value("grid_error", json());
        if (bound.is_number())
            put(cells, metrics_.place(grid_bound_column(column, several_)),
                shortest(bound.get<double>()));
        return bound.is_number();
    }

    void assemble(const std::string& path) {
        std::ofstream out(path, std::ios::binary);
        std::ifstream rows(rows_path_, std::ios::binary);
        const std::vector<StudyTableColumn> columns =
            all_columns(study_, metrics_.columns, targets_.columns);
        out << header_text(study_, columns, results_.warnings);
        for (std::string line; std::getline(rows, line);) {
            const std::size_t first = line.find('\x1e'), second = line.find('\x1e', first + 1),
                              third = line.find('\x1e', second + 1),
                              fourth = line.find('\x1e', third + 1);
            out << line.substr(0, first)
                << padded(line.substr(first + 1, second - first - 1), metrics_.columns.size())
                << ',' << line.substr(third + 1, fourth - third - 1)
                << padded(line.substr(second + 1, third - second - 1), targets_.columns.size())
                << ',' << line.substr(fourth + 1) << '\n';
        }
        if (!out.flush()) throw OutputError(path, "cannot write the file", "the disk may be full");
    }

    /// Cells with a comma before each, filled up to `count`. None of them is quoted.
    static std::string padded(const std::string& cells, std::size_t count) {
        if (count == 0) return "";
        const auto commas = static_cast<std::size_t>(std::count(cells.begin(), cells.end(), ','));
        return "," + cells + std::string(count - 1 - commas, ',');
    }

    const std::string& folder_;
    const Study& study_;
    const bool several_;
    const std::string rows_path_;
    FoundColumns metrics_, targets_;
    std::map<std::string, bool> cpu_kinds_;
    StudyResults results_;
};

} // namespace

StudyResults write_study_results(const std::string& folder, const Study& study) {
    return ResultsWriter(folder, study).write();
}

} // namespace rille::engine
