// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

using namespace rille::engine;
namespace fs = std::filesystem;

namespace {

std::string read(const fs::path& path) {
    std::ostringstream text;
    text << std::ifstream(path).rdbuf();
    return text.str();
}

std::string report_of(const fs::path& path) {
    try {
        parse_case(read(path), path.filename().string(), path.parent_path().string());
    } catch (const InputError& error) {
        return std::string(error.what()) + "\n";
    }
    return "accepted\n";
}

} // namespace

// Oracle: the report beside each file, written out in full: NAME.txt for NAME.yaml.
// Source: tests/data/malformed.
// Tolerance: none, character by character.
TEST_CASE("malformed case files are refused with exactly the stated report") {
    std::vector<fs::path> files;
    for (const auto& entry : fs::directory_iterator(std::string(RILLE_TESTS) + "/data/malformed"))
        if (entry.path().extension() == ".yaml") files.push_back(entry.path());
    std::sort(files.begin(), files.end());
    CHECK(files.size() >= 20);
    for (fs::path path : files) {
        const std::string report = report_of(path);
        INFO(path.filename());
        CHECK(report == read(path.replace_extension(".txt")));
    }
}
