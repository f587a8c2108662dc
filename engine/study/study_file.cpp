// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_plan.hpp"
#include "engine/study/study_schema.hpp"

#include "engine/case_schema.hpp"
#include "engine/metrics.hpp"
#include "engine/output_folder.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <filesystem>

namespace rille::engine {

namespace {

namespace fs = std::filesystem;

/// "cd_loss of line at bottom" and "bottom cd_loss of line": the metric and the opening.
struct MetricWords {
    std::string metric, feature;
};

MetricWords metric_words(const std::string& text) {
    MetricWords words{text, ""};
    const std::size_t at = words.metric.rfind(" at ");
    if (at != std::string::npos) {
        const std::string label = trimmed(words.metric.substr(at + 4));
        words.metric = label + " " + words.metric.substr(0, at);
    }
    const std::size_t of = words.metric.rfind(" of ");
    if (of == std::string::npos) return words;
    words.feature = trimmed(words.metric.substr(of + 4));
    words.metric = trimmed(words.metric.substr(0, of));
    return words;
}

StudyKeep::Part part_of(const std::string& word) {
    using Part = StudyKeep::Part;
    return word == "metrics"        ? Part::metrics
           : word == "last profile" ? Part::last_profile
           : word == "picture"      ? Part::picture
           : word == "history"      ? Part::history
           : word == "frames"       ? Part::frames
                                    : Part::everything;
}

/// Whether a word stands alone or in a list.
std::vector<StudyKeep::Part> parts_of(const Entry& entry) {
    std::vector<StudyKeep::Part> parts;
    if (entry.items.empty() && entry.rule->kind == Rule::Kind::word)
        parts.push_back(part_of(entry.text));
    for (const Entry& item : entry.items)
        if (item.is_good) parts.push_back(part_of(item.text));
    return parts;
}

double seconds_in(const Entry& entry, Problems& problems) {
    const std::string text = entry.text.substr(0, entry.text.find(" per"));
    const QuantityText read = parse_quantity(text, Dimension::time);
    if (!read.error.empty()) problems.add(entry.at, entry.path, read.error);
    return read.value;
}

double megabytes_in(const Entry& entry, Problems& problems) {
    const NumberText read = split_number(entry.text);
    if (!read.error.empty() || (read.unit != "MB" && read.unit != "GB") || !(read.value > 0))
        problems.add(entry.at, entry.path,
                     fmt::format("{} is no amount of memory; write for example 2 GB, or from check",
                                 quoted(entry.text)));
    return read.unit == "GB" ? 1000 * read.value : read.value;
}

void read_slurm(StudyReading& r) {
    const Entry& entry = r.root["slurm"];
    if (!entry.is_good) return;
    SlurmSettings& slurm = r.study.slurm;
    slurm.partition = entry["partition"].text;
    slurm.account = entry["account"].text;
    slurm.qos = entry["qos"].text;
    slurm.constraint = entry["constraint"].text;
    const Entry &time = entry["time"], &memory = entry["memory"];
    if (time.is_good && time.text != "from check")
        slurm.seconds_per_point = seconds_in(time, r.problems);
    if (memory.is_good && memory.text != "from check")
        slurm.memory_mb = megabytes_in(memory, r.problems);
    slurm.points_per_task = static_cast<int>(entry["points_per_task"].number);
    slurm.cpus_per_task = static_cast<int>(entry["cpus_per_task"].number);
    const Entry& most = entry["at_most"];
    if (most.is_good) {
        const NumberText read = split_number(most.text);
        const bool fits = read.error.empty() && read.value >= 1 && read.value <= 1e6 &&
                          (read.unit.empty() || read.unit == "tasks" || read.unit == "task");
        if (fits)
            slurm.at_most_tasks = static_cast<int>(read.value);
        else
            r.problems.add(most.at, most.path,
                           fmt::format("{} is no number of tasks; write for example 60 tasks",
                                       quoted(most.text)));
    }
    for (const Entry& line : entry["lines"].items)
        slurm.lines.push_back(line.text);
    slurm.warn_before_kill_s = entry["warn_before_kill"].number;
    slurm.retries_killed = static_cast<int>(entry["retries"]["killed"].number);
}

/// A case file that was given in place of a study.
bool is_case(const YamlNode& node) {
    return node.find("stack") && node.find("plasmas") && !node.find("base");
}

} // namespace

void read_base(StudyReading& r, const std::vector<std::string>& overrides) {
    const Entry& base = r.root["base"];
    if (!base.is_good) r.problems.throw_if_any();
    const fs::path path = (fs::path(r.folder) / base.text).lexically_normal();
    r.study.base_file = path.string();
    if (!fs::is_regular_file(path)) {
        r.problems.add(base.at, base.path, fmt::format("no such file: {}", path.string()));
        r.problems.throw_if_any();
    }
    Problems own;
    YamlNode document = read_yaml_file(path.string(), own);
    r.plan.base_name = path.string();
    r.plan.base_folder = path.parent_path().empty() ? "." : path.parent_path().string();
    if (document.is_map()) {
        apply_overrides(document, overrides, own);
        r.plan.document = document;
        BuiltCase built = build_case(document, r.plan.base_name, r.plan.base_folder, r.is_new, own);
        r.base_root = std::move(built.root);
        r.study.base = std::move(built.result);
    }
    for (const Problem& problem : own.sorted())
        r.problems.add({problem.file, problem.line, problem.column}, problem.path, problem.message);
    if (!own.empty()) r.problems.throw_if_any();
    // As it was written: copies of plasmas stay copies.
    absolute_files(document, r.plan.base_folder);
    Problems none;
    Entry written = without_defaults(check(document, case_rules(), none));
    r.study.base.inputs.clear();
    keep_inputs(written, r.study.base);
    r.study.base.resolved_yaml = to_yaml(written);
}

void read_answer(StudyReading& r) {
    const Entry& answer = r.root["answer"];
    if (!answer.is_good) return;
    const Entry &y = answer["y"], &x = answer["x"], &line = answer["line_per"];
    std::vector<std::string> names, openings;
    for (const MetricName& metric : metric_names(r.study.base))
        names.push_back(metric.name);
    for (const geometry::Opening& opening : r.study.base.mask.openings)
        openings.push_back(opening.name);
    StudyAnswer& result = r.study.answer;
    if (y.is_good) {
        const MetricWords words = metric_words(y.text);
        if (std::find(names.begin(), names.end(), words.metric) == names.end())
            r.problems.add(y.at, y.path,
                           fmt::format("no quantity is called {}; there are: {}{}",
                                       quoted(words.metric), listed(names, 24),
                                       did_you_mean(words.metric, names)));
        if (!words.feature.empty() &&
            std::find(openings.begin(), openings.end(), words.feature) == openings.end())
            r.problems.add(y.at, y.path,
                           fmt::format("no opening is called {}; there are: {}{}",
                                       quoted(words.feature), listed(openings, 8),
                                       did_you_mean(words.feature, openings)));
        result.y = words.metric;
        result.feature = words.feature;
    }
    const auto& columns = r.study.columns;
    if (r.has_lost_columns) return; // what they name may be one of those
    if (x.is_good) result.x = find_column(columns, x.text, x.at, x.path, r.problems).value_or(0);
    if (line.is_good)
        result.line_per = find_column(columns, line.text, line.at, line.path, r.problems);
    if (line.is_good && result.line_per == result.x && r.problems.empty())
        r.problems.add(line.at, line.path,
                       "is x already; one line for each value needs another "
                       "axis");
}

void read_keep_and_slurm(StudyReading& r) {
    const Entry& keep = r.root["keep"];
    if (keep.is_good) {
        if (keep["each"].is_given || keep["failed"].is_given) {
            if (keep["each"].is_good) r.study.keep.each = parts_of(keep["each"]);
            if (keep["failed"].is_good) r.study.keep.failed = parts_of(keep["failed"]);
        } else if (keep.rule->kind != Rule::Kind::map) {
            r.study.keep.each = parts_of(keep);
        }
    }
    read_slurm(r);
}

namespace {

Study read_study(const std::string& path, const std::vector<std::string>& overrides, bool is_new) {
    StudyReading r;
    r.is_new = is_new;
    const YamlNode node = read_yaml_file(path, r.problems);
    if (!node.is_map()) r.problems.throw_if_any();
    if (is_case(node)) {
        r.problems.add(node.at, "",
                       "this is a case, not a study: rille run etches it, and a study "
                       "names it under the key base");
        r.problems.throw_if_any();
    }
    r.folder = fs::path(path).parent_path().string();
    if (r.folder.empty()) r.folder = ".";
    r.root = check(node, study_rules(), r.problems);
    r.study.file = path;
    r.study.title = r.root["title"].text;
    read_base(r, overrides);
    read_axes(r);
    if (r.problems.empty()) read_linked(r);
    read_answer(r);
    read_comparison(r);
    read_keep_and_slurm(r);
    if (r.problems.empty()) {
        r.study.design = std::make_shared<Study::Plan>(r.plan);
        if (is_new) check_points(r);
    }
    r.problems.throw_if_any();
    list_constants(r);
    write_resolved(r);
    return std::move(r.study);
}

} // namespace

Study load_study(const std::string& path, const std::vector<std::string>& overrides) {
    return read_study(path, overrides, true);
}

Study reload_study(const std::string& path) {
    return read_study(path, {}, false);
}

} // namespace rille::engine
