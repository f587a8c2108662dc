// SPDX-License-Identifier: Apache-2.0
#include "engine/study/worker_process.hpp"

#include <array>
#include <cerrno>
#include <csignal>
#include <cstring>
#include <fcntl.h>
#include <fmt/format.h>
#include <spawn.h>
#include <stdexcept>
#include <sys/wait.h>
#include <unistd.h>

extern char** environ;

namespace rille::engine {
namespace {

/// Closed in whatever is started later: a worker must see the end of its own pipe only.
std::array<int, 2> make_pipe() {
    std::array<int, 2> ends{};
    if (pipe2(ends.data(), O_CLOEXEC) != 0)
        throw std::runtime_error(std::string("no pipe to a worker: ") + std::strerror(errno));
    return ends;
}

void close_once(int& descriptor) {
    if (descriptor >= 0) close(descriptor);
    descriptor = -1;
}

} // namespace

WorkerProcess::WorkerProcess(const std::string& program, const std::string& folder, int count)
    : threads(count) {
    const std::array<int, 2> orders = make_pipe(), answers = make_pipe();
    posix_spawn_file_actions_t actions;
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_adddup2(&actions, orders[0], STDIN_FILENO);
    posix_spawn_file_actions_adddup2(&actions, answers[1], STDOUT_FILENO);
    std::string words[] = {"rille", "study-worker", folder, "--threads", std::to_string(count)};
    char* arguments[] = {words[0].data(), words[1].data(), words[2].data(),
                         words[3].data(), words[4].data(), nullptr};
    const int error = posix_spawn(&pid_, program.c_str(), &actions, nullptr, arguments, environ);
    posix_spawn_file_actions_destroy(&actions);
    close(orders[0]);
    close(answers[1]);
    to_ = orders[1];
    from_ = answers[0];
    lines_ = LineReader(from_);
    if (error == 0) return;
    pid_ = -1;
    close_once(to_);
    close_once(from_);
    throw std::runtime_error("a worker cannot be started: " + std::string(std::strerror(error)));
}

WorkerProcess::~WorkerProcess() {
    end();
    close_once(from_);
}

void WorkerProcess::run(const Job& given) {
    job = given;
    write_line(to_, fmt::format("run {} {}", given.index, given.tries));
}

void WorkerProcess::set_threads(int count) {
    if (count == threads) return;
    threads = count;
    write_line(to_, fmt::format("threads {}", count));
}

void WorkerProcess::stop() {
    close_once(to_);
}

std::string WorkerProcess::end() {
    stop();
    if (pid_ < 0) return "ended";
    int status = 0;
    while (waitpid(pid_, &status, 0) < 0 && errno == EINTR) {
    }
    pid_ = -1;
    if (WIFSIGNALED(status))
        return fmt::format("killed by signal {} ({})", WTERMSIG(status),
                           strsignal(WTERMSIG(status)));
    return fmt::format("ended with status {}", WEXITSTATUS(status));
}

} // namespace rille::engine
