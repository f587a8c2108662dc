// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>

namespace rille::engine {

/// Reads lines from a pipe without waiting for more than there is.
class LineReader {
public:
    explicit LineReader(int descriptor) : descriptor_(descriptor) {}
    /// Whether there is something to read, or the end, within that time.
    bool wait(int milliseconds) const;
    /// Reads what is there (waits if nothing is); false at the end.
    bool read();
    /// The next whole line that was read.
    std::optional<std::string> next();

private:
    int descriptor_;
    std::string buffer_;
};

/// Writes a line; line breaks in it become spaces. False if nobody reads any more.
bool write_line(int descriptor, const std::string& line);

} // namespace rille::engine
