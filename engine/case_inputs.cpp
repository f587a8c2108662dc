// SPDX-License-Identifier: Apache-2.0
// The files that a case names: read once more as they are, so that a run can leave copies of them.
#include "engine/case_build.hpp"

#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"

#include <algorithm>
#include <filesystem>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

/// A name for the copy that no other file has: data.csv, data-2.csv, data-3.csv.
std::string copy_name(const fs::path& path, const std::vector<InputFile>& taken) {
    for (int n = 1;; ++n) {
        const std::string tail = n > 1 ? "-" + std::to_string(n) : "";
        std::string name = std::string(output_names::inputs) + "/" + path.stem().string() + tail +
                           path.extension().string();
        const bool is_free = std::none_of(taken.begin(), taken.end(),
                                          [&](const InputFile& file) { return file.name == name; });
        if (is_free) return name;
    }
}

void keep(Entry& entry, std::vector<InputFile>& inputs) {
    if (!entry.is_good || !fs::path(entry.text).is_absolute()) return;
    const auto known = std::find_if(inputs.begin(), inputs.end(),
                                    [&](const InputFile& file) { return file.path == entry.text; });
    if (known != inputs.end()) {
        entry.text = known->name;
        return;
    }
    inputs.push_back({entry.text, copy_name(entry.text, inputs), read_file(entry.text)});
    entry.text = inputs.back().name;
}

void keep_files_below(Entry& entry, std::vector<InputFile>& inputs) {
    for (auto& [key, value] : entry.members) {
        if (names_a_file(key)) keep(value, inputs);
        keep_files_below(value, inputs);
    }
}

} // namespace

void keep_inputs(Entry& root, Case& result) {
    for (auto& [key, value] : root.members) {
        if (key == "chemistry") keep(value, result.inputs);
        if (key == "plasmas" || key == "measured" || key == "start")
            keep_files_below(value, result.inputs);
    }
}

} // namespace rille::engine
