// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <stdexcept>
#include <string>
#include <vector>

namespace rille::engine {

/// Where something was written: lines and columns count from 1; line 0 = the whole file (or a
/// command-line option, then `file` holds the option as typed).
struct Location {
    std::string file;
    int line = 0;
    int column = 0;
};

/// One thing wrong with the input.
struct Problem {
    std::string file;
    int line = 0;
    int column = 0;
    std::string path; ///< keys from the root of the file, "mask.openings.trench.cd"; may be empty
    std::string message; ///< what was found and what is allowed, one line
};

/// "case.yaml:12:14: mask.openings.trench.cd: ..." on one line.
std::string describe(const Problem&);

/// Everything wrong with the input (exit status 3). what() is the whole report, one problem a line,
/// in the order of the file.
class InputError : public std::runtime_error {
public:
    explicit InputError(std::vector<Problem> problems);
    const std::vector<Problem>& problems() const { return problems_; }

private:
    std::vector<Problem> problems_;
};

/// Collects problems, so that all of them are reported in one go.
class Problems {
public:
    void add(const Location&, const std::string& path, const std::string& message);
    bool any_at(const Location&) const; ///< something is said about that very place already
    bool empty() const { return problems_.empty(); }
    std::size_t size() const { return problems_.size(); }
    /// Ordered by position; a file's problems stay together, first file first, and problems of
    /// command-line options come last.
    std::vector<Problem> sorted() const;
    void throw_if_any() const; ///< throws InputError

private:
    std::vector<Problem> problems_;
};

} // namespace rille::engine
