// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::engine {

/// Number of single-character insertions, deletions, replacements and swaps of neighbours between
/// two words (optimal string alignment distance).
int edit_distance(const std::string& a, const std::string& b);

/// The candidate closest to `word` if it is close enough to be a slip of the pen (at most one edit
/// per three characters, letter case ignored), else empty.
std::string closest(const std::string& word, const std::vector<std::string>& candidates);

/// "; did you mean \"cd\"?" or nothing.
std::string did_you_mean(const std::string& word, const std::vector<std::string>& candidates);

/// In double quotes, control characters escaped, cut after 60 characters.
std::string quoted(const std::string& text);

/// "a, b or c"; at most `most` are named, the rest counted.
std::string listed(const std::vector<std::string>& words, std::size_t most = 30);

std::string trimmed(const std::string& text);
std::string lower_case(std::string text); ///< ASCII letters only

} // namespace rille::engine
