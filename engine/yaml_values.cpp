// SPDX-License-Identifier: Apache-2.0
#include "engine/yaml_values.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

std::string with_unit(double value, std::optional<Dimension> dimension) {
    return dimension ? format_quantity(value, *dimension) : fmt::format("{:.12g}", value);
}

/// A scalar is due. Says so otherwise; `due` is "a length, for example 60 nm".
bool is_scalar(const YamlNode& node, const std::string& due, Problems& problems) {
    if (node.is_scalar()) return true;
    problems.add(node.at, node.path,
                 node.is_empty() ? fmt::format("has no value; {} is due", due)
                                 : fmt::format("{} stands where {} is due", what_it_is(node), due));
    return false;
}

bool in_range(const YamlNode& node, double value, const Range& range,
              std::optional<Dimension> dimension, Problems& problems) {
    if (range.contains(value)) return true;
    problems.add(node.at, node.path,
                 fmt::format("{} is out of range; allowed is {}", quoted(node.text),
                             range_text(range, dimension)));
    return false;
}

} // namespace

std::string other_reading(const std::string& text) {
    const std::string low = lower_case(text);
    for (const char* word : {"yes", "on", "y", "true"})
        if (low == word) return "true";
    for (const char* word : {"no", "off", "n", "false"})
        if (low == word) return "false";
    if (low == "null" || low == "~") return "nothing";
    if (low == ".nan" || low == ".inf" || low == "-.inf" || low == "+.inf") return "a number";
    const bool digits = !text.empty() && text.find_first_not_of("0123456789:") == std::string::npos;
    if (digits && text.find(':') != std::string::npos) return "a number to base 60";
    if (digits && text.size() > 1 && text[0] == '0') return "an octal number";
    return "";
}

bool Range::contains(double value) const {
    return (low_open ? value > low : value >= low) && (high_open ? value < high : value <= high);
}

std::string range_text(const Range& range, std::optional<Dimension> dimension) {
    std::string text;
    if (std::isfinite(range.low))
        text = (range.low_open ? "more than " : "at least ") + with_unit(range.low, dimension);
    if (std::isfinite(range.high))
        text += (text.empty() ? "" : " and ") +
                ((range.high_open ? "less than " : "at most ") + with_unit(range.high, dimension));
    return text;
}

std::optional<double> read_quantity(const YamlNode& node, Dimension dimension, const Range& range,
                                    Problems& problems) {
    const std::string due = fmt::format("{} ({})", noun(dimension), example(dimension));
    if (!is_scalar(node, due, problems)) return std::nullopt;
    const QuantityText quantity = parse_quantity(node.text, dimension);
    if (!quantity.error.empty()) {
        problems.add(node.at, node.path, quantity.error);
        return std::nullopt;
    }
    if (!in_range(node, quantity.value, range, dimension, problems)) return std::nullopt;
    return quantity.value;
}

std::optional<double> read_number(const YamlNode& node, const Range& range, Problems& problems) {
    if (!is_scalar(node, "a number", problems)) return std::nullopt;
    const NumberText number = split_number(node.text);
    std::string error = number.error;
    if (error.empty() && !number.unit.empty())
        error = fmt::format("{}: a number without a unit is due", quoted(node.text));
    else if (!error.empty())
        error += "; a number is due";
    if (!error.empty()) {
        problems.add(node.at, node.path, error);
        return std::nullopt;
    }
    if (!in_range(node, number.value, range, std::nullopt, problems)) return std::nullopt;
    return number.value;
}

std::optional<long long> read_integer(const YamlNode& node, const Range& range,
                                      Problems& problems) {
    const std::optional<double> number = read_number(node, range, problems);
    if (!number) return std::nullopt;
    constexpr double largest = 9007199254740992.0; // 2^53: beyond it doubles skip integers
    if (*number == std::floor(*number) && std::abs(*number) <= largest)
        return static_cast<long long>(*number);
    problems.add(node.at, node.path, fmt::format("{} is not a whole number", quoted(node.text)));
    return std::nullopt;
}

std::optional<bool> read_truth(const YamlNode& node, Problems& problems) {
    if (!is_scalar(node, "true or false", problems)) return std::nullopt;
    if (node.text == "true") return true;
    if (node.text == "false") return false;
    const std::string other = other_reading(node.text);
    const bool means_one = other == "true" || other == "false";
    problems.add(
        node.at, node.path,
        means_one
            ? fmt::format("{} is not read as a truth value; write {}", quoted(node.text), other)
            : fmt::format("{} stands where true or false is due", quoted(node.text)));
    return std::nullopt;
}

std::optional<std::string> read_text(const YamlNode& node, Problems& problems) {
    if (!is_scalar(node, "text", problems)) return std::nullopt;
    const std::string other = node.is_quoted ? "" : other_reading(node.text);
    if (!other.empty()) {
        problems.add(node.at, node.path,
                     fmt::format("{} reads as {} in YAML; put it in quotes if it is meant as text",
                                 node.text, other));
        return std::nullopt;
    }
    if (trimmed(node.text).empty()) {
        problems.add(node.at, node.path, "is empty; text is due");
        return std::nullopt;
    }
    return node.text;
}

std::optional<std::string> read_word(const YamlNode& node, const std::vector<std::string>& words,
                                     Problems& problems) {
    if (!is_scalar(node, listed(words), problems)) return std::nullopt;
    if (std::find(words.begin(), words.end(), node.text) != words.end()) return node.text;
    const bool comment = node.text.find('#') != std::string::npos;
    problems.add(node.at, node.path,
                 fmt::format("{} is not known here; allowed: {}{}", quoted(node.text),
                             listed(words),
                             comment ? "; a comment needs a space before #"
                                     : did_you_mean(node.text, words)));
    return std::nullopt;
}

MapReader::MapReader(const YamlNode& node, Problems& problems) : node_(node), problems_(problems) {
    if (node.is_map()) return;
    problems.add(node.at, node.path,
                 node.is_empty() ? "has no value; a map of keys and values is due"
                                 : fmt::format("{} stands where a map of keys and values is due",
                                               what_it_is(node)));
}

const YamlNode* MapReader::optional(const std::string& key) {
    asked_.push_back(key);
    return node_.find(key);
}

const YamlNode* MapReader::required(const std::string& key) {
    const YamlNode* value = optional(key);
    if (!value && node_.is_map())
        problems_.add(node_.at, node_.path, fmt::format("the key {} is missing", quoted(key)));
    return value;
}

void MapReader::finish() {
    for (const YamlNode::Member& member : node_.members) {
        if (std::find(asked_.begin(), asked_.end(), member.key) != asked_.end()) continue;
        const std::string guess = did_you_mean(member.key, asked_);
        problems_.add(member.key_at, member.value.path,
                      guess.empty() ? fmt::format("unknown key; allowed: {}", listed(asked_))
                                    : "unknown key" + guess);
    }
}

} // namespace rille::engine
