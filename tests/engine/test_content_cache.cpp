// SPDX-License-Identifier: Apache-2.0
#include "engine/content_cache.hpp"

#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>

using namespace rille::engine;
namespace fs = std::filesystem;

TEST_CASE("the cache gives back what was kept, for the same content only", "[cache]") {
    const fs::path folder = fs::temp_directory_path() / "rille_content_cache_test";
    fs::remove_all(folder);
    const ContentCache cache(folder.string());
    const std::vector<double> content = {1, 2.5, -3}, values = {0.1, 1e300, -0.0};
    CHECK_FALSE(cache.find(content));
    cache.keep(content, values);
    REQUIRE(cache.find(content));
    CHECK(*cache.find(content) == values);
    CHECK_FALSE(cache.find({1, 2.5, -3.0000000000000004}));

    SECTION("a damaged file counts as absent") {
        const fs::path file = fs::directory_iterator(folder)->path();
        {
            std::fstream stream(file, std::ios::in | std::ios::out | std::ios::binary);
            stream.seekp(70);
            stream.put('x');
        }
        CHECK_FALSE(cache.find(content));
        cache.keep(content, values);
        CHECK(cache.find(content));
    }
    SECTION("no folder keeps nothing") {
        const ContentCache none("");
        none.keep(content, values);
        CHECK_FALSE(none.find(content));
    }
    fs::remove_all(folder);
}
