// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/yaml_values.hpp"

#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// One row of the table that drives the reader, the JSON schema and the documentation: what may
/// stand under a key.
struct Rule {
    enum class Kind {
        text,     ///< any text
        word,     ///< one of `words`
        sentence, ///< text of the form `form`, matched by the regular expression `pattern`
        integer,
        number,
        truth,        ///< true or false
        quantity,     ///< number with a unit
        quantities,   ///< one quantity or a list of them, `least_items` to `most_items` long
        anything,     ///< kept as written
        map,          ///< known keys: `members`
        list,         ///< any number of `members[0]`, at least `least_items`
        dictionary,   ///< names chosen by the user, each with a value by `members[0]`
        alternatives, ///< a map whose key `selector` says which of `members` it follows
        either        ///< the one of `members` that is written like it: scalar, list or map
    };
    std::string key; ///< for alternatives: the selecting word, "" = selector absent, "*" = present
    Kind kind = Kind::text;
    std::string meaning; ///< one line
    Dimension dimension = Dimension::length;
    Range range;
    std::vector<std::string> words;
    std::vector<std::pair<std::string, std::string>> later_words; ///< word, sentence
    std::string form, pattern;
    std::string default_text; ///< as it would be written; empty = no default
    bool is_required = false;
    std::string refusal; ///< not empty: refused by name with this sentence
    std::size_t least_items = 1, most_items = 1000000;
    std::string selector;
    std::vector<Rule> members;

    Rule& required();
    Rule& by_default(const std::string& text);
    Rule& items(std::size_t least, std::size_t most = 1000000);
    const Rule* member(const std::string& name) const;
};

// Makers of rules; the last argument is always the meaning.
Rule text_rule(const std::string& key, const std::string& meaning);
Rule word_rule(const std::string& key, std::vector<std::string> words, const std::string& meaning);
Rule sentence_rule(const std::string& key, const std::string& form, const std::string& pattern,
                   const std::string& meaning);
Rule integer_rule(const std::string& key, const Range&, const std::string& meaning);
Rule number_rule(const std::string& key, const Range&, const std::string& meaning);
Rule truth_rule(const std::string& key, const std::string& meaning);
Rule quantity_rule(const std::string& key, Dimension, const Range&, const std::string& meaning);
Rule quantities_rule(const std::string& key, Dimension, const Range&, const std::string& meaning);
Rule anything_rule(const std::string& key, const std::string& meaning);
Rule map_rule(const std::string& key, std::vector<Rule> members, const std::string& meaning);
Rule list_rule(const std::string& key, Rule item, const std::string& meaning);
Rule dictionary_rule(const std::string& key, Rule value, const std::string& meaning);
Rule alternatives_rule(const std::string& key, const std::string& selector,
                       std::vector<Rule> alternatives, const std::string& meaning);
/// Forms in which one thing may be written: at most one that is a scalar, one list, one map.
Rule either_rule(const std::string& key, std::vector<Rule> forms, const std::string& meaning);
/// A key that a later version will read; `instead` says what to use now.
Rule later_rule(const std::string& key, const std::string& instead);
/// A key that is never read because it would say too little; `sentence` says what to write.
Rule refused_rule(const std::string& key, const std::string& sentence);

} // namespace rille::engine
