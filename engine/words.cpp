// SPDX-License-Identifier: Apache-2.0
#include "engine/words.hpp"

#include <algorithm>
#include <cctype>

namespace rille::engine {

int edit_distance(const std::string& a, const std::string& b) {
    const std::size_t rows = a.size() + 1, columns = b.size() + 1;
    std::vector<int> cost(rows * columns);
    const auto at = [&](std::size_t i, std::size_t j) -> int& { return cost[i * columns + j]; };
    for (std::size_t i = 0; i < rows; ++i)
        at(i, 0) = static_cast<int>(i);
    for (std::size_t j = 0; j < columns; ++j)
        at(0, j) = static_cast<int>(j);
    for (std::size_t i = 1; i < rows; ++i)
        for (std::size_t j = 1; j < columns; ++j) {
            const int replace = at(i - 1, j - 1) + (a[i - 1] != b[j - 1]);
            at(i, j) = std::min({at(i - 1, j) + 1, at(i, j - 1) + 1, replace});
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                at(i, j) = std::min(at(i, j), at(i - 2, j - 2) + 1);
        }
    return cost.back();
}

std::string closest(const std::string& word, const std::vector<std::string>& candidates) {
    const std::string asked = lower_case(word.substr(0, 80));
    std::string best;
    int least = 0;
    for (const std::string& candidate : candidates) {
        const int distance = edit_distance(asked, lower_case(candidate));
        const int allowed =
            std::max(1, static_cast<int>(std::min(asked.size(), candidate.size()) + 1) / 3);
        if (candidate.size() < 2 && distance > 0) continue;
        if (distance <= allowed && (best.empty() || distance < least)) {
            best = candidate;
            least = distance;
        }
    }
    return best;
}

std::string did_you_mean(const std::string& word, const std::vector<std::string>& candidates) {
    const std::string best = closest(word, candidates);
    return best.empty() ? "" : "; did you mean " + quoted(best) + "?";
}

std::string quoted(const std::string& text) {
    const char* digits = "0123456789abcdef";
    std::string result = "\"";
    std::size_t used = 0;
    for (const char c : text) {
        const bool inside_character = (static_cast<unsigned char>(c) & 0xc0u) == 0x80u;
        if (++used > 60 && !inside_character) return result + "...\"";
        if (c == '\n')
            result += "\\n";
        else if (c == '\t')
            result += "\\t";
        else if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f)
            result += std::string("\\x") + digits[(c >> 4) & 15] + digits[c & 15];
        else
            result += c;
    }
    return result + "\"";
}

std::string listed(const std::vector<std::string>& words, std::size_t most) {
    std::string result;
    const std::size_t shown = std::min(words.size(), most);
    for (std::size_t w = 0; w < shown; ++w) {
        const bool last = w + 1 == words.size() && w > 0;
        result += (w == 0 ? "" : last ? " or " : ", ") + words[w];
    }
    if (shown < words.size()) result += " and " + std::to_string(words.size() - shown) + " more";
    return result;
}

std::string trimmed(const std::string& text) {
    const char* blank = " \t\r\n";
    const std::size_t first = text.find_first_not_of(blank);
    if (first == std::string::npos) return "";
    return text.substr(first, text.find_last_not_of(blank) - first + 1);
}

std::string lower_case(std::string text) {
    for (char& c : text)
        if (c >= 'A' && c <= 'Z') c = static_cast<char>(c - 'A' + 'a');
    return text;
}

} // namespace rille::engine
