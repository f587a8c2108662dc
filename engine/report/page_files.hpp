// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string_view>
#include <vector>

namespace rille::engine {

/// A style sheet or a script of the pages, as it lies in engine/report.
struct PageFile {
    std::string_view name; ///< "page.js"
    std::string_view text;
};

/// All of them, put into the program when it is built (embed.cmake).
const std::vector<PageFile>& page_files();

} // namespace rille::engine
