// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <functional>
#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

namespace rille::engine {

/// A file or folder could not be read or written (exit status 5). what() is
/// "PATH: what was tried: reason".
struct OutputError : std::runtime_error {
    OutputError(std::string path_, const std::string& tried, const std::string& reason)
        : std::runtime_error(path_ + ": " + tried + ": " + reason), path(std::move(path_)) {}
    std::string path;
};

/// The folder that a run leaves. Every file is written whole or not at all: under a temporary name
/// beside its place, then renamed.
class OutputFolder {
public:
    enum class Existing { refuse, force, keep };

    /// Creates the folder (and its parents) and proves that it can be written, before anything is
    /// computed. A folder that holds anything is refused, or with `force` taken over: what an
    /// earlier run left under the names that a run writes is removed, other files stay; with `keep`
    /// everything stays, and the folder must be there.
    /// Throws OutputError.
    OutputFolder(std::string path, Existing existing);

    const std::string& path() const { return path_; }
    /// `name` is relative to the folder and may contain folders; they are made. Replaces an earlier
    /// file of that name. Throws OutputError, leaving an earlier file as it was.
    void write(const std::string& name, std::string_view content);
    /// The same for a writer that needs a path of its own; `writer` gets the temporary one.
    void write_with(const std::string& name, const std::function<void(const std::string&)>& writer);
    /// Takes a file of an earlier part of the run for written.
    void note(const std::string& name);
    /// Removes a file if it is there.
    void remove(const std::string& name);
    /// Names of the files written so far, sorted.
    std::vector<std::string> written() const;

private:
    std::string path_;
    std::vector<std::string> written_;
};

/// The whole file; throws OutputError.
std::string read_file(const std::string& path);

} // namespace rille::engine
