// SPDX-License-Identifier: Apache-2.0
// Paths of the case file as a study names them, and values as it shows them.
#include "engine/study/study_plan.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <filesystem>

namespace rille::engine {

namespace {

using Kind = Rule::Kind;

struct Child {
    std::string name;
    const Entry* entry;
};

std::vector<Child> children(const Entry& entry) {
    std::vector<Child> list;
    for (const auto& [key, value] : entry.members)
        list.push_back({key, &value});
    for (const Entry& item : entry.items)
        if (item["name"].is_good) list.push_back({item["name"].text, &item});
    return list;
}

/// The child that the path goes on with: the longest name that fits, for names may hold dots.
const Child* next_child(const std::vector<Child>& list, const std::string& rest) {
    const Child* best = nullptr;
    for (const Child& child : list) {
        const bool fits = rest == child.name || rest.rfind(child.name + ".", 0) == 0;
        if (fits && (!best || child.name.size() > best->name.size())) best = &child;
    }
    return best;
}

std::string unknown(const std::string& rest, const Rule* rule, const std::vector<Child>& list) {
    std::vector<std::string> names;
    for (const Child& child : list)
        names.push_back(child.name);
    if (rule && rule->kind == Kind::map)
        for (const Rule& member : rule->members)
            if (member.refusal.empty() &&
                std::find(names.begin(), names.end(), member.key) == names.end())
                names.push_back(member.key);
    const std::string first = rest.substr(0, rest.find('.'));
    const std::string guess = did_you_mean(first, names);
    return fmt::format("nothing is called {} there{}", quoted(first),
                       !guess.empty()  ? guess
                       : names.empty() ? ""
                                       : "; there are: " + listed(names, 24));
}

/// Goes on by the table alone, where the case has left a map out.
PathTarget find_by_rule(const Rule* rule, std::string rest) {
    while (!rest.empty()) {
        if (rule->kind == Kind::dictionary) return {&rule->members[0], nullptr, ""};
        const std::string key = rest.substr(0, rest.find('.'));
        const Rule* member = rule->kind == Kind::map ? rule->member(key) : nullptr;
        if (!member) return {nullptr, nullptr, unknown(rest, rule, {})};
        if (!member->refusal.empty()) return {nullptr, nullptr, member->refusal};
        rule = member;
        rest = key.size() < rest.size() ? rest.substr(key.size() + 1) : "";
    }
    return {rule, nullptr, ""};
}

std::string why_no_value(const PathTarget& target, const std::string& path) {
    switch (target.rule->kind) {
    case Kind::map:
    case Kind::list:
    case Kind::dictionary:
    case Kind::alternatives:
    case Kind::either: {
        std::vector<std::string> names;
        if (target.entry)
            for (const Child& child : children(*target.entry))
                names.push_back(child.name);
        return fmt::format("is not a single value{}",
                           names.empty() ? "" : "; name one below it: " + listed(names, 16));
    }
    case Kind::anything:
        return "is kept with the result and not used by the model: there is nothing to vary";
    default:
        break;
    }
    const std::string last = path.substr(path.rfind('.') + 1);
    if (last == "name" || path == "format" || path == "title")
        return "names things and changes nothing";
    return "";
}

/// The last names of a path, `count` of them. Names that hold dots are cut like the others.
std::string tail_of(const std::string& path, int count) {
    std::size_t at = path.size();
    for (int i = 0; i < count && at != std::string::npos; ++i)
        at = at == 0 ? std::string::npos : path.rfind('.', at - 1);
    return at == std::string::npos ? path : path.substr(at + 1);
}

/// The file that a value names, beside the study or among its inputs; kept with the study.
void find_file(StudyReading& r, AxisValue& value) {
    namespace fs = std::filesystem;
    value.text = fs::path(value.node.text).filename().string();
    fs::path path = fs::path(r.folder) / value.node.text;
    if (!fs::exists(path)) path = fs::path(r.folder) / "inputs" / value.text;
    if (!fs::is_regular_file(path)) {
        r.problems.add(value.node.at, value.node.path,
                       fmt::format("no such file: {}", value.node.text));
        return;
    }
    value.node.text = fs::absolute(path).lexically_normal().string();
    if (keep_input(r.study, value.node.text) != "inputs/" + value.text)
        r.problems.add(value.node.at, value.node.path,
                       fmt::format("two different files are called {}; rename one", value.text));
}

} // namespace

bool ends_path(const std::string& end, const std::string& path) {
    return path == end ||
           (path.size() > end.size() &&
            path.compare(path.size() - end.size() - 1, end.size() + 1, "." + end) == 0);
}

PathTarget find_path(const Entry& root, const std::string& path) {
    const Entry* entry = &root;
    std::string rest = path;
    PathTarget target{root.rule, &root, ""};
    while (!rest.empty()) {
        const std::vector<Child> list = children(*entry);
        const Child* next = next_child(list, rest);
        if (!next) {
            const Rule* rule = entry->rule;
            const std::string key = rest.substr(0, rest.find('.'));
            const bool known = rule && (rule->kind == Kind::dictionary ||
                                        (rule->kind == Kind::map && rule->member(key)));
            if (!known) return {nullptr, nullptr, unknown(rest, rule, list)};
            target = find_by_rule(rule, rest);
            break;
        }
        entry = next->entry;
        target = {entry->rule, entry, ""};
        rest = next->name.size() < rest.size() ? rest.substr(next->name.size() + 1) : "";
    }
    if (!target.rule) return target;
    const std::string why = why_no_value(target, path);
    return why.empty() ? target : PathTarget{nullptr, nullptr, why};
}

void give_numbers(std::vector<AxisValue>& values, const Rule& rule, std::string& unit) {
    const bool in_words = rule.kind == Kind::word || rule.kind == Kind::truth;
    bool all = !in_words && !values.empty();
    unit.clear();
    for (AxisValue& value : values) {
        const NumberText read = split_number(value.node.is_scalar() ? value.node.text : "");
        all = all && read.error.empty();
        if (!all) break;
        value.number = read.value;
        if (&value == &values.front()) unit = read.unit;
        if (read.unit == unit) continue;
        all = false;
        if (rule.kind != Kind::quantity && rule.kind != Kind::quantities) break;
        const QuantityText inside = parse_quantity(value.node.text, rule.dimension);
        for (const UnitDefinition& one : units_of(rule.dimension))
            if (unit == one.text && inside.error.empty()) {
                value.number = inside.value / one.factor - one.offset;
                all = true;
            }
    }
    if (!all)
        for (AxisValue& value : values)
            value.number.reset();
    if (all && unit.empty()) unit = "1";
    if (!all) unit.clear();
}

YamlNode number_node(double value, const std::string& unit, const Location& at) {
    YamlNode node;
    node.kind = YamlNode::Kind::scalar;
    node.at = at;
    node.text = fmt::format("{:.12g}", value);
    if (!unit.empty()) node.text += " " + unit;
    return node;
}

std::optional<std::size_t> find_column(const std::vector<StudyColumn>& columns,
                                       const std::string& name, const Location& at,
                                       const std::string& path, Problems& problems) {
    std::vector<std::size_t> fitting;
    std::vector<std::string> labels;
    for (std::size_t c = 0; c < columns.size(); ++c) {
        if (columns[c].path == name) return c;
        if (ends_path(name, columns[c].path)) fitting.push_back(c);
        labels.push_back(columns[c].label);
    }
    if (fitting.size() == 1) return fitting[0];
    if (fitting.empty())
        problems.add(at, path,
                     fmt::format("{} is not varied; there are: {}{}", quoted(name), listed(labels),
                                 did_you_mean(name, labels)));
    else
        problems.add(at, path,
                     fmt::format("{} fits several of what is varied; write {} or {}", quoted(name),
                                 columns[fitting[0]].label, columns[fitting[1]].label));
    return std::nullopt;
}

void label_columns(std::vector<StudyColumn>& columns) {
    for (StudyColumn& column : columns)
        for (int count = 1;; ++count) {
            column.label = tail_of(column.path, count);
            const auto others =
                std::count_if(columns.begin(), columns.end(), [&](const StudyColumn& other) {
                    return ends_path(column.label, other.path);
                });
            if (others <= 1 || column.label == column.path) break;
        }
}

std::optional<std::size_t> add_column(StudyReading& r, const std::string& path,
                                      const Location& at) {
    const PathTarget target = find_path(r.base_root, path);
    if (!target.rule) {
        r.has_lost_columns = true;
        r.problems.add(at, path, target.error);
        return std::nullopt;
    }
    for (const StudyColumn& column : r.study.columns)
        if (column.path == path) {
            r.problems.add(at, path, "is varied already");
            return std::nullopt;
        }
    StudyColumn column;
    column.path = path;
    r.study.columns.push_back(std::move(column));
    r.rules.push_back(target.rule);
    return r.study.columns.size() - 1;
}

void check_values(StudyReading& r, std::size_t column, std::vector<AxisValue>& values) {
    const std::string& path = r.study.columns[column].path;
    const std::string key = path.substr(path.rfind('.') + 1);
    for (AxisValue& value : values) {
        value.node.path = path;
        check(value.node, *r.rules[column], r.problems);
        value.text = value.node.text;
        for (const YamlNode& item : value.node.items)
            value.text += (value.text.empty() ? "[" : ", ") + item.text;
        if (value.node.is_list()) value.text += "]";
        const bool is_file = names_a_file(key) ||
                             (key == "chemistry" && value.text.find(".yaml") != std::string::npos);
        if (is_file && value.node.is_scalar()) find_file(r, value);
    }
}

} // namespace rille::engine
