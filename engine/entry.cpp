// SPDX-License-Identifier: Apache-2.0
#include "engine/entry.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

namespace rille::engine {

namespace {

using Kind = Rule::Kind;

Entry entry_for(const YamlNode& node, const Rule& rule) {
    Entry entry;
    entry.rule = &rule;
    entry.is_given = true;
    entry.at = node.at;
    entry.path = node.path;
    entry.text = node.text;
    return entry;
}

template <class T>
bool store(Entry& entry, const std::optional<T>& value) {
    entry.is_good = value.has_value();
    if (value) entry.number = static_cast<double>(*value);
    return entry.is_good;
}

/// "a map with the keys name, material", "a list", for messages.
std::string due(const Rule& rule) {
    if (rule.kind == Kind::list) return "a list";
    std::vector<std::string> keys;
    for (const Rule& member : rule.members)
        if (member.refusal.empty() && !member.key.empty()) keys.push_back(member.key);
    return keys.empty() || rule.kind == Kind::alternatives
               ? "a map of keys and values"
               : fmt::format("a map with {}", listed(keys, 6));
}

bool is_structure(const YamlNode& node, const Rule& rule, Problems& problems) {
    const bool fits = rule.kind == Kind::list ? node.is_list() : node.is_map();
    if (!fits)
        problems.add(node.at, node.path,
                     fmt::format(node.is_empty() ? "has no value; {1} is due"
                                                 : "{0} stands where {1} is due",
                                 what_it_is(node), due(rule)));
    return fits;
}

void report_unknown(const YamlNode& node, const YamlNode::Member& member, const Rule& rule,
                    Problems& problems) {
    std::vector<std::string> allowed;
    std::vector<std::string> absent; // a key that is there already was not meant
    for (const Rule& known : rule.members) {
        if (!known.refusal.empty()) continue;
        allowed.push_back(known.key);
        if (!node.find(known.key)) absent.push_back(known.key);
    }
    std::string guess = did_you_mean(member.key, absent);
    const std::string near = closest(member.key, allowed);
    if (guess.empty() && !near.empty() && edit_distance(member.key, near) == 1)
        guess = did_you_mean(member.key, {near}); // one letter off: meant all the same
    problems.add(member.key_at, member.value.path,
                 guess.empty() ? fmt::format("unknown key; allowed: {}", listed(allowed))
                               : "unknown key" + guess);
}

void report_missing(const YamlNode& node, const Rule& member, Problems& problems) {
    std::string form = member.meaning;
    if (member.kind == Kind::quantity || member.kind == Kind::quantities)
        form += "; for example " + example(member.dimension);
    problems.add(node.at, node.path,
                 fmt::format("the key {} is missing ({})", quoted(member.key), form));
}

Entry default_entry(const YamlNode& parent, const Rule& rule) {
    YamlNode node;
    node.at = parent.at;
    node.path = (parent.path.empty() ? "" : parent.path + ".") + rule.key;
    const bool is_map = rule.default_text == "{}";
    node.kind = is_map ? YamlNode::Kind::map : YamlNode::Kind::scalar;
    if (!is_map) node.text = rule.default_text;
    Problems none;
    Entry entry = check(node, rule, none);
    none.throw_if_any();
    entry.is_given = false;
    return entry;
}

/// Whether the key is named by the refusal of another one that stands in its place ("give
/// spacing"): then its absence goes without saying.
bool is_named_by_refusal(const YamlNode& node, const Rule& rule, const std::string& key) {
    for (const Rule& later : rule.members)
        if (node.find(later.key) && later.refusal.find("give " + key) != std::string::npos)
            return true;
    return false;
}

void check_map(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    for (const YamlNode::Member& member : node.members) {
        const Rule* known = rule.member(member.key);
        if (!known)
            report_unknown(node, member, rule, problems);
        else if (!known->refusal.empty()) {
            problems.add(member.key_at, member.value.path, known->refusal);
            entry.has_refused = true;
        }
    }
    for (const Rule& member : rule.members) {
        if (!member.refusal.empty()) continue;
        if (const YamlNode* value = node.find(member.key))
            entry.members.emplace_back(member.key, check(*value, member, problems));
        else if (member.is_required && !node.is_damaged &&
                 !is_named_by_refusal(node, rule, member.key))
            report_missing(node, member, problems);
        if (!node.find(member.key) && !member.default_text.empty())
            entry.members.emplace_back(member.key, default_entry(node, member));
    }
}

void check_dictionary(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    for (const YamlNode::Member& member : node.members) {
        const Rule* later = rule.member(member.key);
        if (later && !later->refusal.empty())
            problems.add(member.key_at, member.value.path, later->refusal);
        else
            entry.members.emplace_back(member.key, check(member.value, rule.members[0], problems));
    }
}

void check_items(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    if (node.items.size() < rule.least_items)
        problems.add(node.at, node.path,
                     fmt::format("is an empty list; at least {} is due", rule.least_items));
    std::vector<std::pair<std::string, int>> names; // with the line of their first use
    for (const YamlNode& item : node.items) {
        entry.items.push_back(check(item, rule.members[0], problems));
        const YamlNode* name = item.find("name");
        if (!name || !name->is_scalar()) continue;
        for (const auto& [used, line] : names)
            if (used == name->text)
                problems.add(name->at, name->path,
                             fmt::format("the name {} is used twice; the first is on line {}",
                                         quoted(used), line));
        names.emplace_back(name->text, name->at.line);
    }
}

/// Which alternative a map follows; nullptr if its selector is wrong (reported).
const Rule* alternative(const YamlNode& node, const Rule& rule, Problems& problems) {
    const YamlNode* selector = node.find(rule.selector);
    std::vector<std::string> words;
    for (const Rule& choice : rule.members) {
        if (choice.key == (selector ? "*" : "")) return &choice;
        if (selector && choice.key == selector->text) return &choice;
        words.push_back(choice.key);
    }
    if (selector)
        read_word(*selector, words, problems);
    else
        problems.add(node.at, node.path,
                     fmt::format("the key {} is missing; allowed: {}", quoted(rule.selector),
                                 listed(words)));
    return nullptr;
}

void check_quantities(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    const std::size_t count = node.is_list() ? node.items.size() : 1;
    if (count < rule.least_items || count > rule.most_items) {
        const char* form = rule.least_items == 2 ? "two lengths [x, y]" : "one length or [x, y]";
        problems.add(
            node.at, node.path,
            fmt::format("{} stands where {} is due",
                        node.is_list() ? fmt::format("a list of {}", count) : what_it_is(node),
                        form));
        return;
    }
    entry.is_good = true;
    for (std::size_t i = 0; i < count; ++i) {
        const YamlNode& one = node.is_list() ? node.items[i] : node;
        const auto value = read_quantity(one, rule.dimension, rule.range, problems);
        entry.is_good = entry.is_good && value.has_value();
        if (value) entry.numbers.push_back(*value);
        if (node.is_list()) entry.text += (i ? ", " : "[") + one.text;
    }
    if (node.is_list()) entry.text += "]";
}

void check_word(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    for (const auto& [word, sentence] : rule.later_words)
        if (node.is_scalar() && node.text == word) {
            problems.add(node.at, node.path,
                         fmt::format("{} is not available yet: {}", quoted(word), sentence));
            return;
        }
    entry.is_good = read_word(node, rule.words, problems).has_value();
}

/// The form that is written like the node; nullptr and a problem if there is none.
const Rule* form_like(const YamlNode& node, const Rule& rule, Problems& problems) {
    std::vector<std::string> forms;
    for (const Rule& form : rule.members) {
        const bool is_list = form.kind == Kind::list;
        const bool is_map = form.kind == Kind::map || form.kind == Kind::dictionary ||
                            form.kind == Kind::alternatives;
        if (is_list ? node.is_list() : is_map ? node.is_map() : node.is_scalar()) return &form;
        forms.push_back(is_list || is_map    ? due(form)
                        : form.words.empty() ? "text"
                                             : listed(form.words));
    }
    problems.add(
        node.at, node.path,
        fmt::format(node.is_empty() ? "has no value; {1} is due" : "{0} stands where {1} is due",
                    what_it_is(node), listed(forms)));
    return nullptr;
}

void check_structure(const YamlNode& node, const Rule& rule, Entry& entry, Problems& problems) {
    if (!is_structure(node, rule, problems)) return;
    entry.is_good = !node.is_damaged;
    if (rule.kind == Kind::list)
        check_items(node, rule, entry, problems);
    else if (rule.kind == Kind::dictionary)
        check_dictionary(node, rule, entry, problems);
    else
        check_map(node, rule, entry, problems);
}

} // namespace

const Entry& Entry::operator[](const std::string& key) const {
    static const Entry absent;
    for (const auto& [name, entry] : members)
        if (name == key) return entry;
    return absent;
}

Entry check(const YamlNode& node, const Rule& rule, Problems& problems) {
    Entry entry = entry_for(node, rule);
    switch (rule.kind) {
    case Kind::sentence: // numbers in it are judged by whoever reads the sentence
        entry.is_good = node.is_scalar() || read_text(node, problems).has_value();
        break;
    case Kind::text:
        entry.is_good = read_text(node, problems).has_value();
        break;
    case Kind::word:
        check_word(node, rule, entry, problems);
        break;
    case Kind::integer:
        store(entry, read_integer(node, rule.range, problems));
        break;
    case Kind::number:
        store(entry, read_number(node, rule.range, problems));
        break;
    case Kind::truth:
        store(entry, read_truth(node, problems));
        break;
    case Kind::quantity:
        store(entry, read_quantity(node, rule.dimension, rule.range, problems));
        break;
    case Kind::quantities:
        check_quantities(node, rule, entry, problems);
        break;
    case Kind::anything:
        entry.raw = node;
        entry.is_good = true;
        break;
    case Kind::map:
    case Kind::list:
    case Kind::dictionary:
        check_structure(node, rule, entry, problems);
        break;
    case Kind::alternatives:
        if (!is_structure(node, rule, problems)) break;
        if (const Rule* choice = alternative(node, rule, problems))
            return check(node, *choice, problems);
        break;
    case Kind::either:
        if (const Rule* form = form_like(node, rule, problems)) return check(node, *form, problems);
        break;
    }
    return entry;
}

} // namespace rille::engine
