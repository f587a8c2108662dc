// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/rule.hpp"

#include <string>
#include <utility>
#include <vector>

namespace rille::engine {

/// One value of the input, checked against its rule. Absent keys with a default hold the default,
/// so that whoever builds from entries never asks what was written.
struct Entry {
    const Rule* rule = nullptr;
    bool is_given = false; ///< written by the user
    bool is_good = false;  ///< holds a value (given or default); false: absent or already reported
    bool has_refused = false; ///< a map: a key that is refused by name was written
    Location at;
    std::string path;
    std::string text;            ///< scalars as written
    double number = 0;           ///< integer, number, quantity in inside units; truth 0 or 1
    std::vector<double> numbers; ///< quantities
    std::vector<std::pair<std::string, Entry>> members; ///< map, dictionary, alternatives
    std::vector<Entry> items;                           ///< list
    YamlNode raw;                                       ///< anything

    /// The member of that name; an entry that is neither given nor good if there is none.
    const Entry& operator[](const std::string& key) const;
};

/// Checks a node and everything below it against a rule; every problem is added, and what is
/// usable is returned.
Entry check(const YamlNode&, const Rule&, Problems&);

/// The entry as YAML, every default filled in, valid as input again.
std::string to_yaml(const Entry&);
/// A node on one line, as it may stand behind a key.
std::string to_yaml(const YamlNode&);
/// The entry without the values that were not written.
Entry without_defaults(const Entry&);

} // namespace rille::engine
