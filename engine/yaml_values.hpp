// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/units.hpp"
#include "engine/yaml_reader.hpp"

#include <limits>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// What values are allowed, in inside units; the ends count as allowed unless said otherwise.
struct Range {
    double low = -std::numeric_limits<double>::infinity();
    double high = std::numeric_limits<double>::infinity();
    bool low_open = false;  ///< low itself is not allowed
    bool high_open = false; ///< high itself is not allowed
    bool contains(double value) const;
};
/// "more than 0 nm", "at least 1 and at most 64"; empty for everything.
std::string range_text(const Range&, std::optional<Dimension>);

constexpr double infinite = std::numeric_limits<double>::infinity();
inline Range above_zero() {
    return {0, infinite, true, false};
}
inline Range zero_or_more() {
    return {0, infinite, false, false};
}

/// What a YAML 1.1 reader would make of plain text ("false" of NO, "a number to base 60" of 1:30);
/// empty if it stays text.
std::string other_reading(const std::string& text);

// Each reads one value, or adds a problem that names what was found and what is allowed, and
// returns nothing. An empty value (`key:`) is always a problem.
std::optional<double> read_quantity(const YamlNode&, Dimension, const Range&, Problems&);
std::optional<double> read_number(const YamlNode&, const Range&, Problems&);
std::optional<long long> read_integer(const YamlNode&, const Range&, Problems&);
/// true or false, nothing else.
std::optional<bool> read_truth(const YamlNode&, Problems&);
/// Any text. Words that YAML readers take for something else (NO, on, ~, null, 1:30, 010, .inf)
/// must be in quotes.
std::optional<std::string> read_text(const YamlNode&, Problems&);
/// One of several words.
std::optional<std::string> read_word(const YamlNode&, const std::vector<std::string>& words,
                                     Problems&);

/// "A key is missing" and "unknown key" for readers of maps.
class MapReader {
public:
    /// A node that is not a map is a problem; every get then returns nothing.
    MapReader(const YamlNode&, Problems&);
    bool is_map() const { return node_.is_map(); }
    /// nullptr if the key is absent.
    const YamlNode* optional(const std::string& key);
    /// nullptr and a problem if the key is absent.
    const YamlNode* required(const std::string& key);
    /// Every key that was never asked for is a problem. Call last.
    void finish();

private:
    const YamlNode& node_;
    Problems& problems_;
    std::vector<std::string> asked_;
};

} // namespace rille::engine
