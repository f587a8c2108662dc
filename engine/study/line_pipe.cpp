// SPDX-License-Identifier: Apache-2.0
#include "engine/study/line_pipe.hpp"

#include <algorithm>
#include <cerrno>
#include <poll.h>
#include <unistd.h>

namespace rille::engine {

bool LineReader::wait(int milliseconds) const {
    pollfd one{descriptor_, POLLIN, 0};
    return poll(&one, 1, milliseconds) > 0;
}

bool LineReader::read() {
    char bytes[4096];
    ssize_t got = 0;
    do
        got = ::read(descriptor_, bytes, sizeof bytes);
    while (got < 0 && errno == EINTR);
    if (got <= 0) return false;
    buffer_.append(bytes, static_cast<std::size_t>(got));
    return true;
}

std::optional<std::string> LineReader::next() {
    const std::size_t end = buffer_.find('\n');
    if (end == std::string::npos) return std::nullopt;
    std::string line = buffer_.substr(0, end);
    buffer_.erase(0, end + 1);
    return line;
}

bool write_line(int descriptor, const std::string& line) {
    std::string text = line;
    std::replace(text.begin(), text.end(), '\n', ' ');
    text += '\n';
    for (std::size_t done = 0; done < text.size();) {
        const ssize_t put = write(descriptor, text.data() + done, text.size() - done);
        if (put < 0 && errno == EINTR) continue;
        if (put <= 0) return false;
        done += static_cast<std::size_t>(put);
    }
    return true;
}

} // namespace rille::engine
