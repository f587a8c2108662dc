// SPDX-License-Identifier: Apache-2.0
#include "engine/problems.hpp"

#include <algorithm>
#include <map>
#include <tuple>

namespace rille::engine {

std::string describe(const Problem& problem) {
    std::string line = problem.file;
    if (problem.line > 0)
        line += ":" + std::to_string(problem.line) + ":" + std::to_string(problem.column);
    if (!problem.path.empty()) line += ": " + problem.path;
    return line + ": " + problem.message;
}

namespace {

std::string report(const std::vector<Problem>& problems) {
    std::string text;
    for (const Problem& problem : problems)
        text += (text.empty() ? "" : "\n") + describe(problem);
    return text;
}

} // namespace

InputError::InputError(std::vector<Problem> problems)
    : std::runtime_error(report(problems)), problems_(std::move(problems)) {}

void Problems::add(const Location& at, const std::string& path, const std::string& message) {
    // A value that is copied to several places of the case is wrong only once.
    for (const Problem& known : problems_)
        if (known.line == at.line && known.line > 0 && known.column == at.column &&
            known.file == at.file && known.message == message)
            return;
    problems_.push_back({at.file, at.line, at.column, path, message});
}

bool Problems::any_at(const Location& at) const {
    return std::any_of(problems_.begin(), problems_.end(), [&](const Problem& known) {
        return known.file == at.file && known.line == at.line && known.column == at.column;
    });
}

std::vector<Problem> Problems::sorted() const {
    std::map<std::string, int> order; // of first appearance
    for (const Problem& problem : problems_)
        order.emplace(problem.file, static_cast<int>(order.size()));
    const auto key = [&](const Problem& p) {
        const bool option = p.file.rfind("--", 0) == 0;
        return std::make_tuple(option, order.at(p.file), p.line, p.column);
    };
    std::vector<Problem> result = problems_;
    std::stable_sort(result.begin(), result.end(),
                     [&](const Problem& a, const Problem& b) { return key(a) < key(b); });
    return result;
}

void Problems::throw_if_any() const {
    if (!empty()) throw InputError(sorted());
}

} // namespace rille::engine
