// SPDX-License-Identifier: Apache-2.0
#include "engine/study/external_program.hpp"

#include <array>
#include <cerrno>
#include <cstring>
#include <fcntl.h>
#include <poll.h>
#include <spawn.h>
#include <sys/wait.h>
#include <unistd.h>

extern char** environ;

namespace rille::engine {
namespace {

/// Reads both pipes to their ends.
void read_all(std::array<int, 2> from, std::array<std::string*, 2> into) {
    while (from[0] >= 0 || from[1] >= 0) {
        pollfd ears[2] = {{from[0], POLLIN, 0}, {from[1], POLLIN, 0}};
        if (poll(ears, 2, -1) < 0) {
            if (errno == EINTR) continue;
            return;
        }
        for (int i = 0; i < 2; ++i) {
            if (from[i] < 0 || ears[i].revents == 0) continue;
            char bytes[4096];
            const ssize_t got = read(from[i], bytes, sizeof bytes);
            if (got > 0)
                into[i]->append(bytes, static_cast<std::size_t>(got));
            else if (got == 0 || errno != EINTR)
                from[i] = -1;
        }
    }
}

} // namespace

ProgramEnd run_program(const std::vector<std::string>& words) {
    ProgramEnd end;
    int out[2], err[2];
    if (pipe2(out, O_CLOEXEC) != 0 || pipe2(err, O_CLOEXEC) != 0)
        return {127, "", std::strerror(errno)};
    std::vector<char*> arguments;
    std::vector<std::string> copies = words;
    for (std::string& word : copies)
        arguments.push_back(word.data());
    arguments.push_back(nullptr);
    posix_spawn_file_actions_t actions;
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_adddup2(&actions, out[1], STDOUT_FILENO);
    posix_spawn_file_actions_adddup2(&actions, err[1], STDERR_FILENO);
    pid_t pid = -1;
    const int error =
        posix_spawnp(&pid, arguments[0], &actions, nullptr, arguments.data(), environ);
    posix_spawn_file_actions_destroy(&actions);
    close(out[1]);
    close(err[1]);
    if (error == 0) read_all({out[0], err[0]}, {&end.output, &end.errors});
    close(out[0]);
    close(err[0]);
    if (error != 0) return {127, "", std::strerror(error)};
    int status = 0;
    while (waitpid(pid, &status, 0) < 0 && errno == EINTR) {
    }
    end.status = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
    return end;
}

} // namespace rille::engine
