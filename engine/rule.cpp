// SPDX-License-Identifier: Apache-2.0
#include "engine/rule.hpp"

namespace rille::engine {

namespace {

Rule rule_of(Rule::Kind kind, const std::string& key, const std::string& meaning) {
    Rule rule;
    rule.kind = kind;
    rule.key = key;
    rule.meaning = meaning;
    return rule;
}

} // namespace

Rule& Rule::required() {
    is_required = true;
    return *this;
}

Rule& Rule::by_default(const std::string& text) {
    default_text = text;
    return *this;
}

Rule& Rule::items(std::size_t least, std::size_t most) {
    least_items = least;
    most_items = most;
    return *this;
}

const Rule* Rule::member(const std::string& name) const {
    for (const Rule& rule : members)
        if (rule.key == name) return &rule;
    return nullptr;
}

Rule text_rule(const std::string& key, const std::string& meaning) {
    return rule_of(Rule::Kind::text, key, meaning);
}

Rule word_rule(const std::string& key, std::vector<std::string> words, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::word, key, meaning);
    rule.words = std::move(words);
    return rule;
}

Rule sentence_rule(const std::string& key, const std::string& form, const std::string& pattern,
                   const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::sentence, key, meaning);
    rule.form = form;
    rule.pattern = pattern;
    return rule;
}

Rule integer_rule(const std::string& key, const Range& range, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::integer, key, meaning);
    rule.range = range;
    return rule;
}

Rule number_rule(const std::string& key, const Range& range, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::number, key, meaning);
    rule.range = range;
    return rule;
}

Rule truth_rule(const std::string& key, const std::string& meaning) {
    return rule_of(Rule::Kind::truth, key, meaning);
}

Rule quantity_rule(const std::string& key, Dimension dimension, const Range& range,
                   const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::quantity, key, meaning);
    rule.dimension = dimension;
    rule.range = range;
    return rule;
}

Rule quantities_rule(const std::string& key, Dimension dimension, const Range& range,
                     const std::string& meaning) {
    Rule rule = quantity_rule(key, dimension, range, meaning);
    rule.kind = Rule::Kind::quantities;
    return rule.items(1, 2);
}

Rule anything_rule(const std::string& key, const std::string& meaning) {
    return rule_of(Rule::Kind::anything, key, meaning);
}

Rule map_rule(const std::string& key, std::vector<Rule> members, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::map, key, meaning);
    rule.members = std::move(members);
    return rule;
}

Rule list_rule(const std::string& key, Rule item, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::list, key, meaning);
    rule.members = {std::move(item)};
    return rule;
}

Rule dictionary_rule(const std::string& key, Rule value, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::dictionary, key, meaning);
    rule.members = {std::move(value)};
    return rule;
}

Rule alternatives_rule(const std::string& key, const std::string& selector,
                       std::vector<Rule> alternatives, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::alternatives, key, meaning);
    rule.selector = selector;
    rule.members = std::move(alternatives);
    return rule;
}

Rule either_rule(const std::string& key, std::vector<Rule> forms, const std::string& meaning) {
    Rule rule = rule_of(Rule::Kind::either, key, meaning);
    rule.members = std::move(forms);
    return rule;
}

Rule later_rule(const std::string& key, const std::string& instead) {
    return refused_rule(key, "not available yet: " + instead);
}

Rule refused_rule(const std::string& key, const std::string& sentence) {
    Rule rule = rule_of(Rule::Kind::anything, key, "");
    rule.refusal = sentence;
    return rule;
}

} // namespace rille::engine
