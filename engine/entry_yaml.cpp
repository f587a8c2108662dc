// SPDX-License-Identifier: Apache-2.0
#include "engine/entry.hpp"

#include "engine/words.hpp"

namespace rille::engine {

namespace {

using Kind = Rule::Kind;

/// Text as a YAML scalar: plain where that reads back as the same text, else in quotes.
std::string scalar(const std::string& text) {
    const std::string leading = "-?:,[]{}#&*!|>'\"%@` ";
    bool plain = !text.empty() && leading.find(text[0]) == std::string::npos &&
                 other_reading(text).empty() && text.back() != ' ' && text.back() != ':' &&
                 text.find_first_of("\n\t\"\\,[]{}") == std::string::npos &&
                 text.find(": ") == std::string::npos && text.find('#') == std::string::npos;
    if (text.size() > 1 && text[0] == '-' && text[1] >= '0' && text[1] <= '9') plain = true;
    if (plain) return text;
    std::string result = "\"";
    for (const char c : text) {
        if (c == '"' || c == '\\') result += '\\';
        if (c == '\n')
            result += "\\n";
        else if (c == '\t')
            result += "\\t";
        else
            result += c;
    }
    return result + "\"";
}

std::string raw_yaml(const YamlNode& node) {
    std::string text;
    switch (node.kind) {
    case YamlNode::Kind::empty:
        return "\"\"";
    case YamlNode::Kind::scalar:
        return scalar(node.text);
    case YamlNode::Kind::list:
        for (const YamlNode& item : node.items)
            text += (text.empty() ? "" : ", ") + raw_yaml(item);
        return "[" + text + "]";
    case YamlNode::Kind::map:
        for (const YamlNode::Member& member : node.members)
            text += (text.empty() ? "" : ", ") + scalar(member.key) + ": " + raw_yaml(member.value);
        return "{" + text + "}";
    }
    return text;
}

void write(const Entry& entry, const std::string& indent, std::string& out);

bool is_block(const Entry& entry) {
    return !entry.members.empty() || !entry.items.empty();
}

std::string inline_text(const Entry& entry) {
    switch (entry.rule->kind) {
    case Kind::anything:
        return raw_yaml(entry.raw);
    case Kind::truth:
        return entry.text;
    case Kind::quantities:
        return entry.text; // "60 nm" or "[60 nm, 80 nm]"
    case Kind::list:
        return "[]";
    case Kind::map:
    case Kind::dictionary:
    case Kind::alternatives:
        return "{}";
    default:
        return scalar(entry.text);
    }
}

void write_members(const Entry& entry, const std::string& indent, std::string& out) {
    bool first = true;
    for (const auto& [key, value] : entry.members) {
        if (!first) out += indent;
        first = false;
        out += scalar(key) + ":";
        if (is_block(value)) {
            out += "\n" + indent + "  ";
            write(value, indent + "  ", out);
        } else {
            out += " " + inline_text(value) + "\n";
        }
    }
}

/// Writes a block whose first line is already indented.
void write(const Entry& entry, const std::string& indent, std::string& out) {
    if (!entry.members.empty()) {
        write_members(entry, indent, out);
        return;
    }
    bool first = true;
    for (const Entry& item : entry.items) {
        if (!first) out += indent;
        first = false;
        out += "- ";
        if (is_block(item))
            write(item, indent + "  ", out);
        else
            out += inline_text(item) + "\n";
    }
}

} // namespace

std::string to_yaml(const Entry& entry) {
    std::string out;
    write(entry, "", out);
    return out;
}

std::string to_yaml(const YamlNode& node) {
    return raw_yaml(node);
}

Entry without_defaults(const Entry& entry) {
    Entry given = entry;
    given.members.clear();
    given.items.clear();
    for (const auto& [key, value] : entry.members)
        if (value.is_given) given.members.emplace_back(key, without_defaults(value));
    for (const Entry& item : entry.items)
        given.items.push_back(without_defaults(item));
    return given;
}

} // namespace rille::engine
