// SPDX-License-Identifier: Apache-2.0
// Internal to the table of the case file: parts that are long enough for a file of their own.
#pragma once

#include "engine/rule.hpp"

namespace rille::engine {

/// One plasma under `plasmas`.
Rule plasma_rule();

} // namespace rille::engine
