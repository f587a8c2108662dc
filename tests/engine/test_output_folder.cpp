// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <csignal>
#include <fstream>
#include <sys/resource.h>
#include <sys/wait.h>

using namespace rille;
using engine::OutputError;
using engine::OutputFolder;
using tests::ScratchFolder;

namespace fs = std::filesystem;

namespace {

std::vector<std::string> names_in(const std::string& folder) {
    std::vector<std::string> names;
    for (const auto& entry : fs::directory_iterator(folder))
        names.push_back(entry.path().filename().string());
    std::sort(names.begin(), names.end());
    return names;
}

/// Lets no file of this process grow beyond a size: a disk that is full, for a while.
class FullDisk {
public:
    explicit FullDisk(rlim_t bytes) {
        getrlimit(RLIMIT_FSIZE, &before_);
        rlimit limit = before_;
        limit.rlim_cur = bytes;
        handler_ = std::signal(SIGXFSZ, SIG_IGN);
        setrlimit(RLIMIT_FSIZE, &limit);
    }
    ~FullDisk() {
        setrlimit(RLIMIT_FSIZE, &before_);
        std::signal(SIGXFSZ, handler_);
    }

private:
    rlimit before_{};
    void (*handler_)(int);
};

} // namespace

TEST_CASE("output folder: made with its parents, empty but for what is written") {
    const ScratchFolder scratch;
    OutputFolder folder(scratch / "a/b/run", OutputFolder::Existing::refuse);
    CHECK(names_in(folder.path()).empty());
    folder.write("run.json", "{}\n");
    folder.write("frames/frame_0000.vtp", "<x/>");
    CHECK(engine::read_file(folder.path() + "/run.json") == "{}\n");
    CHECK(names_in(folder.path()) == std::vector<std::string>{"frames", "run.json"});
    CHECK(folder.written() == std::vector<std::string>{"frames/frame_0000.vtp", "run.json"});
}

TEST_CASE("output folder: one that holds files is refused, and taken over by force") {
    const ScratchFolder scratch;
    {
        OutputFolder first(scratch / "run", OutputFolder::Existing::refuse);
        first.write("run.json", "old");
        first.write("frames/frame_0007.vtp", "old");
    }
    std::ofstream(scratch / "run/notes.txt") << "mine";
    CHECK_THROWS_WITH(OutputFolder(scratch / "run", OutputFolder::Existing::refuse),
                      Catch::Contains("holds files") && Catch::Contains(scratch / "run"));
    CHECK(engine::read_file(scratch / "run/run.json") == "old");
    OutputFolder second(scratch / "run", OutputFolder::Existing::force);
    CHECK(names_in(second.path()) == std::vector<std::string>{"frames", "notes.txt"});
    CHECK(names_in(second.path() + "/frames").empty());
    CHECK_NOTHROW(OutputFolder(scratch / "empty", OutputFolder::Existing::refuse));
    CHECK_NOTHROW(OutputFolder(scratch / "empty", OutputFolder::Existing::refuse));
}

TEST_CASE("output folder: what cannot be written is told with path and reason") {
    const ScratchFolder scratch;
    std::ofstream(scratch / "file") << "x";
    CHECK_THROWS_AS(OutputFolder("", OutputFolder::Existing::refuse), OutputError);
    CHECK_THROWS_WITH(OutputFolder(scratch / "file/run", OutputFolder::Existing::refuse),
                      Catch::Contains(scratch / "file/run") && Catch::Contains("Not a directory"));
    CHECK_THROWS_AS(OutputFolder(scratch / "file", OutputFolder::Existing::force), OutputError);
    CHECK_THROWS_AS(OutputFolder("/proc/rille", OutputFolder::Existing::refuse), OutputError);
    {
        const FullDisk full(100); // less than the write test needs
        CHECK_THROWS_WITH(OutputFolder(scratch / "full", OutputFolder::Existing::refuse),
                          Catch::Contains("cannot write") && Catch::Contains("File too large"));
    }
    CHECK(names_in(scratch / "full").empty());
}

TEST_CASE("output folder: a file is written whole or not at all") {
    const ScratchFolder scratch;
    OutputFolder folder(scratch / "run", OutputFolder::Existing::refuse);
    folder.write("history.csv", "before");
    {
        const FullDisk full(1000);
        CHECK_THROWS_AS(folder.write("history.csv", std::string(100000, 'x')), OutputError);
    }
    CHECK(engine::read_file(scratch / "run/history.csv") == "before");
    CHECK_THROWS_WITH(folder.write_with("front.vdb",
                                        [](const std::string& path) {
                                            std::ofstream(path) << "half";
                                            throw std::runtime_error("grid refused");
                                        }),
                      Catch::Contains("front.vdb") && Catch::Contains("grid refused"));
    CHECK(names_in(scratch / "run") == std::vector<std::string>{"history.csv"});
    folder.write("history.csv", "after"); // and it can go on
    CHECK(engine::read_file(scratch / "run/history.csv") == "after");
}

TEST_CASE("output folder: a kill in the middle of a write leaves nothing under the final name") {
    const ScratchFolder scratch;
    OutputFolder folder(scratch / "run", OutputFolder::Existing::refuse);
    folder.write("history.csv", "before");
    for (const char* name : {"history.csv", "frames/frame_0000.vtp"}) {
        const pid_t child = fork();
        REQUIRE(child >= 0);
        if (child == 0) {
            folder.write_with(name, [](const std::string& path) {
                std::ofstream(path) << "half" << std::flush;
                raise(SIGKILL);
            });
            _exit(0);
        }
        int status = 0;
        REQUIRE(waitpid(child, &status, 0) == child);
        REQUIRE(WIFSIGNALED(status));
    }
    CHECK(engine::read_file(scratch / "run/history.csv") == "before");
    CHECK(names_in(scratch / "run/frames") == std::vector<std::string>{".frame_0000.vtp.part"});
    // What was left behind goes when the folder is taken over.
    OutputFolder next(scratch / "run", OutputFolder::Existing::force);
    CHECK(names_in(scratch / "run") == std::vector<std::string>{"frames"});
    CHECK(names_in(scratch / "run/frames").empty());
}
