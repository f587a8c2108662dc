// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rille::engine {

/// Said once in the help, at the end of a run and in every report.
inline constexpr const char* caution =
    "A model prediction, not a released recipe: verify on wafers, and follow the tool maker's "
    "limits, site safety rules, local codes and licensed practice.";

} // namespace rille::engine
