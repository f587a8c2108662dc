// SPDX-License-Identifier: Apache-2.0
#pragma once

// What the raw text of a YAML file tells beside the parser; used by yaml_reader.cpp only.

#include "engine/problems.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

std::vector<std::string> split_lines(const std::string& text);

/// Tabs in the indentation and bytes that are not UTF-8, which the parser does not report, or
/// reports in words that do not help. True if the document should not be parsed.
bool report_text_traps(const std::vector<std::string>& lines, const std::string& file, Problems&);

/// Whether the quote that opens at line, column (from 0) closes again. The parser takes the end of
/// the file for a closing quote.
bool is_closed(const std::vector<std::string>& lines, int line, int column);

/// The likely slip behind a syntax error at `line` (from 1): a missing space after a colon, or a
/// comparison sign.
std::optional<Problem> likely_slip(const std::vector<std::string>& lines, const std::string& file,
                                   int line);

/// The parser's message in words that say what to do.
std::string plain_words(const std::string& parser_message);

} // namespace rille::engine
