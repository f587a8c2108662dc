// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/case_schema.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <filesystem>

namespace rille::engine {

namespace {

void place_everywhere(YamlNode& node, const Location& at) {
    node.at = at;
    for (YamlNode::Member& member : node.members) {
        member.key_at = at;
        place_everywhere(member.value, at);
    }
    for (YamlNode& item : node.items)
        place_everywhere(item, at);
}

std::vector<std::string> names_below(const YamlNode& node) {
    std::vector<std::string> names;
    for (const YamlNode::Member& member : node.members)
        names.push_back(member.key);
    for (const YamlNode& item : node.items)
        if (const YamlNode* name = item.find("name")) names.push_back(name->text);
    return names;
}

/// The node below `node` on the way along a path that starts with one of its names. Names may
/// hold dots, so the longest name that fits is taken. `rest` loses the name and its dot.
YamlNode* descend(YamlNode& node, std::string& rest) {
    std::string best;
    for (const std::string& name : names_below(node)) {
        const bool fits = rest == name || rest.rfind(name + ".", 0) == 0;
        if (fits && name.size() > best.size()) best = name;
    }
    if (best.empty()) return nullptr;
    rest = rest.size() > best.size() ? rest.substr(best.size() + 1) : "";
    if (YamlNode* member = node.find(best)) return member;
    for (YamlNode& item : node.items)
        if (const YamlNode* name = item.find("name"))
            if (name->text == best) return &item;
    return nullptr;
}

/// The rule below `rule` for a key; nullptr where the table knows none.
const Rule* rule_below(const Rule* rule, const std::string& key) {
    if (!rule) return nullptr;
    if (rule->kind == Rule::Kind::map) return rule->member(key);
    return rule->kind == Rule::Kind::dictionary ? &rule->members[0] : nullptr;
}

/// Makes the maps that lead to the last key of `rest`, as far as they are maps of the table that
/// may be left out of a file ("sampling" of sampling.seed). `rest` keeps what could not be made.
YamlNode* make_maps(YamlNode* node, const Rule* rule, std::string& rest, const Location& at) {
    for (std::size_t dot = rest.find('.'); dot != std::string::npos; dot = rest.find('.')) {
        const std::string key = rest.substr(0, dot);
        const bool in_map = rule && rule->kind == Rule::Kind::map && node->is_map();
        rule = rule_below(rule, key);
        const bool is_branch =
            rule && (rule->kind == Rule::Kind::map || rule->kind == Rule::Kind::dictionary);
        if (!in_map || !is_branch) break;
        YamlNode made;
        made.kind = YamlNode::Kind::map;
        made.at = at;
        node->members.push_back({key, at, std::move(made)});
        node = &node->members.back().value;
        rest = rest.substr(dot + 1);
    }
    return node;
}

void apply_override(YamlNode& root, const std::string& text, Problems& problems) {
    const Location at{"--set " + text, 0, 0};
    const std::size_t equals = text.find('=');
    const std::string path = trimmed(text.substr(0, equals));
    if (equals == std::string::npos || path.empty()) {
        problems.add(at, "", "key.path=value is due, for example mask.thickness=\"150 nm\"");
        return;
    }
    Problems own;
    YamlNode value = read_yaml_text(text.substr(equals + 1), at.file, own);
    for (const Problem& problem : own.sorted())
        problems.add(at, path, problem.message);
    if (!own.empty()) return;
    place_everywhere(value, at);
    set_value(root, path, std::move(value), problems);
}

/// Puts a plasma together from the one it copies. `open` holds the names on the way, for loops.
void resolve(YamlNode& plasmas, const std::string& name, std::vector<std::string>& done,
             std::vector<std::string> open, Problems& problems) {
    YamlNode& plasma = *plasmas.find(name);
    const YamlNode* from = plasma.find("from");
    if (!from || std::find(done.begin(), done.end(), name) != done.end()) return;
    done.push_back(name);
    open.push_back(name);
    const std::string base_name = from->text;
    const YamlNode* base = from->is_scalar() ? plasmas.find(base_name) : nullptr;
    const bool loops = std::find(open.begin(), open.end(), base_name) != open.end();
    if (!base || !base->is_map() || loops) {
        std::vector<std::string> others = names_below(plasmas);
        others.erase(std::remove(others.begin(), others.end(), name), others.end());
        problems.add(from->at, from->path,
                     loops
                         ? "plasmas copy each other in a circle"
                         : fmt::format("no plasma is called {}; there are: {}{}", what_it_is(*from),
                                       listed(others), did_you_mean(base_name, others)));
        return;
    }
    resolve(plasmas, base_name, done, open, problems);
    YamlNode result = *plasmas.find(base_name);
    const auto drop = [&](const char* key) {
        auto& list = result.members;
        list.erase(std::remove_if(list.begin(), list.end(), [&](auto& m) { return m.key == key; }),
                   list.end());
    };
    if (plasma.find("rf_bias")) drop("ion_energies");
    if (plasma.find("ion_energies")) drop("rf_bias");
    drop("from");
    for (const YamlNode::Member& own : plasma.members) {
        if (own.key == "from") continue;
        drop(own.key.c_str());
        result.members.push_back(own);
    }
    result.at = plasma.at;
    plasma = std::move(result);
}

void make_absolute(YamlNode* node, const std::string& folder) {
    if (!node || !node->is_scalar() || node->text.empty()) return;
    const std::filesystem::path path(node->text);
    if (path.is_relative())
        node->text = std::filesystem::absolute(folder / path).lexically_normal().string();
}

void make_files_absolute(YamlNode& node, const std::string& folder) {
    for (YamlNode::Member& member : node.members)
        if (names_a_file(member.key))
            make_absolute(&member.value, folder);
        else
            make_files_absolute(member.value, folder);
}

} // namespace

bool names_a_file(const std::string& key) {
    static const char* const keys[] = {"file",  "retarding_curve", "waveform", "cross_sections",
                                       "table", "contour",         "cd_table"};
    return std::find(std::begin(keys), std::end(keys), key) != std::end(keys);
}

void set_value(YamlNode& root, const std::string& path, YamlNode value, Problems& problems) {
    const Location at = value.at;
    YamlNode* node = &root;
    const Rule* rule = &case_rules();
    std::string rest = path;
    while (!rest.empty()) {
        const std::string before = rest;
        YamlNode* next = descend(*node, rest);
        if (!next) break;
        const std::size_t used = before.size() - rest.size() - (rest.empty() ? 0 : 1);
        rule = rule_below(rule, before.substr(0, used));
        node = next;
    }
    node = make_maps(node, rule, rest, at);
    const bool new_key = !rest.empty() && rest.find('.') == std::string::npos &&
                         (node->is_map() || node->is_empty());
    if (rest.empty()) {
        *node = std::move(value);
    } else if (new_key) {
        node->kind = YamlNode::Kind::map; // whether the key is known is checked with all the others
        node->members.push_back({rest, at, std::move(value)});
    } else {
        const std::string first = rest.substr(0, rest.find('.'));
        const std::vector<std::string> names = names_below(*node);
        const std::string guess = did_you_mean(first, names);
        problems.add(at, path,
                     fmt::format("nothing is called {} there{}", quoted(first),
                                 !guess.empty()  ? guess
                                 : names.empty() ? ""
                                                 : "; there are: " + listed(names)));
    }
    set_paths(root, "");
}

void apply_overrides(YamlNode& root, const std::vector<std::string>& overrides,
                     Problems& problems) {
    for (const std::string& text : overrides)
        apply_override(root, text, problems);
}

void copy_plasmas(YamlNode& root, Problems& problems) {
    YamlNode* plasmas = root.find("plasmas");
    if (!plasmas || !plasmas->is_map()) return;
    std::vector<std::string> done;
    for (const std::string& name : names_below(*plasmas))
        if (plasmas->find(name)->is_map()) resolve(*plasmas, name, done, {}, problems);
    set_paths(root, "");
}

void absolute_files(YamlNode& root, const std::string& folder) {
    YamlNode* chemistry = root.find("chemistry");
    const std::string text = chemistry ? chemistry->text : "";
    if (text.find('/') != std::string::npos || text.find(".yaml") != std::string::npos)
        make_absolute(chemistry, folder);
    for (const char* key : {"plasmas", "measured", "start"})
        if (YamlNode* part = root.find(key)) make_files_absolute(*part, folder);
}

} // namespace rille::engine
