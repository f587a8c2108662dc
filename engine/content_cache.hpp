// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// Numbers that took long to compute, kept between runs in a folder of the user under a hash of
/// everything that they follow from. It may be deleted at any time; a file that cannot be read or
/// is damaged counts as absent, and one that cannot be written is not kept. Several processes may
/// share it.
class ContentCache {
public:
    /// `folder` empty: keeps nothing.
    explicit ContentCache(std::string folder) : folder_(std::move(folder)) {}
    /// $XDG_CACHE_HOME/rille, else ~/.cache/rille (XDG Base Directory Specification); nothing is
    /// kept if neither is known.
    static ContentCache of_user();

    /// What was kept for exactly these numbers.
    std::optional<std::vector<double>> find(const std::vector<double>& content) const;
    void keep(const std::vector<double>& content, const std::vector<double>& values) const;

private:
    std::string path_of(const std::vector<double>& content) const;

    std::string folder_;
};

} // namespace rille::engine
