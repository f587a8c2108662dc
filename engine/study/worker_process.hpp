// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/line_pipe.hpp"

#include <optional>
#include <string>
#include <sys/types.h>

namespace rille::engine {

/// A worker as its parent sees it (see worker.hpp for what is said).
class WorkerProcess {
public:
    /// Starts `program study-worker FOLDER --threads N`. Throws std::runtime_error if it cannot be
    /// started.
    WorkerProcess(const std::string& program, const std::string& folder, int threads);
    /// Tells it to stop and waits for its end.
    ~WorkerProcess();
    WorkerProcess(const WorkerProcess&) = delete;
    WorkerProcess& operator=(const WorkerProcess&) = delete;

    struct Job {
        std::size_t index = 0;
        int tries = 1;
        double share = 0; ///< done, as told last
    };
    std::optional<Job> job; ///< what it works on
    bool is_ready = false;  ///< it has read the study
    int threads = 1;        ///< as told last

    void run(const Job&);
    void set_threads(int);
    void stop(); ///< asks it to stop; it answers and ends
    int answers() const { return from_; }
    bool read() { return lines_.read(); } ///< false at the end of its answers
    std::optional<std::string> next_line() { return lines_.next(); }
    /// Waits for its end; "killed by signal 9 (Killed)", "ended with status 1".
    std::string end();

private:
    pid_t pid_ = -1;
    int to_ = -1, from_ = -1;
    LineReader lines_{-1};
};

} // namespace rille::engine
