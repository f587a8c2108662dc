// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/study/point_folder.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::engine;
using tests::StudyFolder;
namespace fs = std::filesystem;

namespace {

/// A study's folder with an empty points/.
void make_points(const StudyFolder& folder) {
    fs::create_directories(folder.path("points"));
}

std::size_t entries(const StudyFolder& folder) {
    return static_cast<std::size_t>(
        std::distance(fs::directory_iterator(folder.path("points")), {}));
}

std::string text_in(const StudyFolder& folder, const std::string& name) {
    return read_file(folder.path("points/" + name));
}

} // namespace

TEST_CASE("names in points/ say what they stand for", "[point_folder]") {
    const auto kind = [](const char* name) { return read_point_entry(name).kind; };
    CHECK(kind("0001") == PointEntry::Kind::finished);
    CHECK(kind(".0001.stopped") == PointEntry::Kind::stopped);
    const PointEntry running = read_point_entry(".0012.node7.example.org.4711");
    CHECK(running.kind == PointEntry::Kind::running);
    CHECK(running.point == "0012");
    CHECK(running.host == "node7.example.org");
    CHECK(running.pid == 4711);
    for (const char* other :
         {"", ".", "..", ".0001", "notes", "0001.txt", ".0001.node.x", ".a.b.1"})
        CHECK(kind(other) == PointEntry::Kind::other);
}

TEST_CASE("a point appears whole, and the first to end wins", "[point_folder]") {
    const StudyFolder folder;
    make_points(folder);
    {
        PointFolder place(folder.path(""), "0001");
        OutputFolder(place.path(), OutputFolder::Existing::keep).write("point.json", "first");
        CHECK_FALSE(PointFolder::is_finished(folder.path(""), "0001"));
        CHECK(place.finish());
    }
    CHECK(PointFolder::is_finished(folder.path(""), "0001"));
    {
        PointFolder place(folder.path(""), "0001");
        OutputFolder(place.path(), OutputFolder::Existing::keep).write("point.json", "second");
        CHECK_FALSE(place.finish());
    }
    CHECK(text_in(folder, "0001/point.json") == "first");
    CHECK(entries(folder) == 1);
    CHECK(count_finished_points(folder.path("")) == 1);
}

TEST_CASE("an attempt that ends by an error leaves nothing", "[point_folder]") {
    const StudyFolder folder;
    make_points(folder);
    { const PointFolder place(folder.path(""), "0001"); }
    CHECK(entries(folder) == 0);
}

TEST_CASE("a stopped point is taken up by one other", "[point_folder]") {
    const StudyFolder folder;
    make_points(folder);
    {
        PointFolder place(folder.path(""), "0001");
        place.stop(); // nothing was saved: nothing to take up
    }
    CHECK(entries(folder) == 0);
    {
        PointFolder place(folder.path(""), "0001");
        OutputFolder(place.path(), OutputFolder::Existing::keep).write("state.bin", "state");
        place.stop();
    }
    CHECK(text_in(folder, ".0001.stopped/state.bin") == "state");
    PointFolder place(folder.path(""), "0001");
    CHECK(place.holds_state());
    CHECK_FALSE(fs::exists(folder.path("points/.0001.stopped")));
    place.empty();
    CHECK_FALSE(place.holds_state());
    CHECK(place.is_there());
}

TEST_CASE("what ended processes have left is cleared, what others do is not", "[point_folder]") {
    const StudyFolder folder;
    make_points(folder);
    const std::string here = host_name();
    const long nobody = 2147483646; // above every process number
    const auto name = [&](const char* point, const std::string& host, long pid) {
        return std::string("points/.") + point + "." + host + "." + std::to_string(pid);
    };
    folder.write(name("0001", here, nobody) + "/profile.csv", "half");
    folder.write(name("0002", here, nobody) + "/state.bin", "state");
    folder.write(name("0003", "elsewhere", nobody) + "/profile.csv", "half");
    folder.write(name("0004", here, 1) + "/profile.csv", "of a process that is no study");
    folder.write("points/0005/point.json", "{}");
    folder.write("points/.0005.stopped/state.bin", "late");
    folder.write("points/notes/mine", "of a person");
    CHECK(clear_ended_points(folder.path("")) == 3);
    CHECK_FALSE(fs::exists(folder.path(name("0001", here, nobody))));
    CHECK(text_in(folder, ".0002.stopped/state.bin") == "state");
    CHECK(fs::exists(folder.path(name("0003", "elsewhere", nobody))));
    CHECK_FALSE(fs::exists(folder.path(name("0004", here, 1))));
    CHECK_FALSE(fs::exists(folder.path("points/.0005.stopped")));
    CHECK(fs::exists(folder.path("points/notes/mine")));
    CHECK(clear_ended_points(folder.path(""), true) == 1);
    CHECK_FALSE(fs::exists(folder.path(name("0003", "elsewhere", nobody))));
}

TEST_CASE("an attempt whose folder was taken away notices", "[point_folder]") {
    const StudyFolder folder;
    make_points(folder);
    PointFolder place(folder.path(""), "0001");
    fs::remove_all(place.path());
    CHECK_FALSE(place.is_there());
    CHECK_FALSE(place.finish());
    CHECK(entries(folder) == 0);
}
