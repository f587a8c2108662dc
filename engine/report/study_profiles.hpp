// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/report/study_figures.hpp"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// The outline that a profile.csv holds: (x, z) [nm], one part a chain, without the points that lie
/// within `tolerance_nm` of the rest. Of a profile in three dimensions the section at y = 0. Empty
/// for a text that is none.
Section profile_outline(const std::string& csv, double tolerance_nm);

/// Last profiles of the points, read when they are asked for.
class ProfileShelf {
public:
    explicit ProfileShelf(const StudyView& view) : view_(view) {}

    /// Empty where the point left no profile.
    const Section& outline(std::size_t row);
    /// Outlines for the page's scripts, of at most `most` points: {"ROW": [[x, z, x, z, ...], ...]}
    /// in nm, rounded to 0.1 nm. `stride` gets which part of the points that is: every stride-th.
    nlohmann::json json_of(std::size_t most, std::size_t& stride);

private:
    const StudyView& view_;
    std::map<std::size_t, Section> read_;
};

/// Final profiles along the axis x, a row for each line of the answer and each slice.
std::vector<std::pair<std::string, ProfileRow>> profile_rows(const StudyView&, ProfileShelf&);

} // namespace rille::engine
