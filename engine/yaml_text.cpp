// SPDX-License-Identifier: Apache-2.0
#include "engine/yaml_text.hpp"

#include <algorithm>
#include <map>
#include <sstream>

namespace rille::engine {

namespace {

/// Column of the first byte that is not UTF-8, 0 if there is none.
int bad_utf8(const std::string& line) {
    for (std::size_t i = 0; i < line.size();) {
        const auto c = static_cast<unsigned char>(line[i]);
        const std::size_t more = c < 0x80                ? 0
                                 : c >= 0xc2 && c < 0xe0 ? 1
                                 : (c & 0xf0) == 0xe0    ? 2
                                 : c >= 0xf0 && c < 0xf5 ? 3
                                                         : 9;
        if (more == 9 || i + more >= line.size() + (more == 0)) return static_cast<int>(i) + 1;
        for (std::size_t k = 1; k <= more; ++k)
            if ((static_cast<unsigned char>(line[i + k]) & 0xc0u) != 0x80u)
                return static_cast<int>(i) + 1;
        i += more + 1;
    }
    return 0;
}

/// "key:value" at the start of a line near a syntax error: {line, column of the key}, or {0, 0}.
Location missing_space(const std::vector<std::string>& lines, const std::string& file, int near) {
    for (int l = std::min<int>(near, static_cast<int>(lines.size())); l >= std::max(1, near - 2);
         --l) {
        const std::string& line = lines[l - 1];
        std::size_t first = line.find_first_not_of(" -");
        if (first == std::string::npos) continue;
        const std::size_t colon = line.find(':', first);
        const std::size_t space = line.find_first_of(" {[\"'#", first);
        if (colon != std::string::npos && colon < space && colon + 1 < line.size() &&
            colon > first && line[colon + 1] != ' ' && line[colon + 1] != '\r')
            return {file, l, static_cast<int>(first) + 1};
    }
    return {};
}

/// ": >= 4 nm" near a syntax error: the place of the sign, or line 0.
Location comparison_sign(const std::vector<std::string>& lines, const std::string& file, int near) {
    for (int l = std::min<int>(near, static_cast<int>(lines.size())); l >= std::max(1, near - 1);
         --l) {
        const std::string& line = lines[l - 1];
        for (std::size_t colon = line.find(": "); colon != std::string::npos;
             colon = line.find(": ", colon + 1)) {
            const std::size_t at = line.find_first_not_of(' ', colon + 1);
            const bool sign = at != std::string::npos && (line[at] == '>' || line[at] == '<');
            const std::size_t next = sign ? line.find_first_not_of("<>= ", at) : std::string::npos;
            if (next != std::string::npos && line[next] >= '0' && line[next] <= '9')
                return {file, l, static_cast<int>(at) + 1};
        }
    }
    return {};
}

} // namespace

std::vector<std::string> split_lines(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream stream(text);
    for (std::string line; std::getline(stream, line);)
        lines.push_back(line);
    return lines;
}

bool report_text_traps(const std::vector<std::string>& lines, const std::string& file,
                       Problems& problems) {
    bool stop = false;
    for (std::size_t l = 0; l < lines.size(); ++l) {
        const int line = static_cast<int>(l) + 1;
        if (const int column = bad_utf8(lines[l])) {
            problems.add({file, line, column}, "", "bytes that are not UTF-8 text");
            stop = true;
        }
        const std::size_t first = lines[l].find_first_not_of(" \t\r");
        const std::size_t tab = lines[l].find('\t');
        if (first != std::string::npos && lines[l][first] != '#' && tab < first) {
            problems.add({file, line, static_cast<int>(tab) + 1}, "",
                         "a tab in the indentation; indent with spaces");
            stop = true;
        }
    }
    return stop;
}

bool is_closed(const std::vector<std::string>& lines, int line, int column) {
    if (line >= static_cast<int>(lines.size()) || column >= static_cast<int>(lines[line].size()))
        return true;
    const char quote = lines[line][column];
    if (quote != '"' && quote != '\'') return true; // a block of literal text
    std::size_t at = static_cast<std::size_t>(column) + 1;
    for (std::size_t l = line; l < lines.size(); ++l, at = 0)
        for (; at < lines[l].size(); ++at) {
            if (quote == '"' && lines[l][at] == '\\')
                ++at;
            else if (lines[l][at] == quote)
                return true;
        }
    return false;
}

std::optional<Problem> likely_slip(const std::vector<std::string>& lines, const std::string& file,
                                   int line) {
    const Location sign = comparison_sign(lines, file, line);
    if (sign.line > 0)
        return Problem{file, sign.line, sign.column, "",
                       "signs such as >= are not read; write at least X, at most X, or X to Y"};
    const Location space = missing_space(lines, file, line);
    if (space.line > 0)
        return Problem{file, space.line, space.column, "", "a space is missing after the colon"};
    return std::nullopt;
}

std::string plain_words(const std::string& parser_message) {
    static const std::map<std::string, std::string> words = {
        {"illegal map value", "a colon where no key can stand; is the line indented like its "
                              "neighbours? Text that holds \": \" needs quotes"},
        {"end of map not found", "keys of one map must be indented alike, and braces closed"},
        {"end of sequence not found", "items of one list must be indented alike"},
        {"end of map flow not found", "a brace { is not closed, or a comma is missing"},
        {"end of sequence flow not found", "a bracket [ is not closed, or a comma is missing"},
        {"unknown escape character: ", "unknown escape after a backslash; in single quotes "
                                       "backslashes are plain"},
    };
    const auto found = words.find(parser_message);
    return found != words.end() ? found->second : parser_message;
}

} // namespace rille::engine
