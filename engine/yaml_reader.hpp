// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// One value of a YAML document, with the place where it was written and its path of keys.
struct YamlNode {
    enum class Kind { empty, scalar, list, map };
    struct Member;

    Kind kind = Kind::empty;
    std::string text;            ///< of a scalar, exactly as written (quotes removed)
    bool is_quoted = false;      ///< a scalar in quotes is text, never a number or a boolean
    bool is_damaged = false;     ///< a map that lost keys which were reported already
    Location at;                 ///< of the value; of the key if the value is empty
    std::string path;            ///< "mask.openings.trench.cd"; list items by name, else "[2]"
    std::vector<YamlNode> items; ///< of a list
    std::vector<Member> members; ///< of a map, in the order of the file; keys are unique

    /// The value under a key, nullptr if there is none.
    const YamlNode* find(const std::string& key) const;
    YamlNode* find(const std::string& key);
    bool is_scalar() const { return kind == Kind::scalar; }
    bool is_list() const { return kind == Kind::list; }
    bool is_map() const { return kind == Kind::map; }
    bool is_empty() const { return kind == Kind::empty; }
};

struct YamlNode::Member {
    std::string key;
    Location key_at;
    YamlNode value;
};

/// "a list", "a map (keys and values)", "\"60\"", "nothing".
std::string what_it_is(const YamlNode&);

/// Sets `path` of a node and everything below it. Items of a list that are maps with a `name` are
/// addressed by it.
void set_paths(YamlNode&, const std::string& path);

/// Reads one YAML document strictly. Refused, each with its own message and place: duplicate and
/// empty keys, keys that are not plain text, a missing space after a colon, tabs in the
/// indentation, anchors, aliases, merge keys, tags, several documents, nesting deeper than 32,
/// more than a million values, bytes that are not UTF-8. Empty values stay in the tree as `empty`.
/// Problems are added to the list; the tree holds whatever could be read (after a syntax error
/// nothing). `name` is the file name used in messages.
YamlNode read_yaml_text(const std::string& text, const std::string& name, Problems&);

/// The same for a file. A file that cannot be read is a problem too. `shown` is its name in
/// messages, the path itself if empty.
YamlNode read_yaml_file(const std::string& path, Problems&, const std::string& shown = "");

} // namespace rille::engine
