// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/study.hpp"

#include <atomic>
#include <functional>
#include <optional>
#include <string>

namespace rille::engine {

struct LocalSettings {
    int workers = 1;        ///< processes at once
    int threads = 1;        ///< of each; the last points get those of workers without work
    int retries_killed = 2; ///< how often a point is tried again whose worker has died
    std::string program = "/proc/self/exe";
};

/// workers x threads for `cores`, where one or both are left open (0): one thread a worker.
LocalSettings local_settings(int workers, int threads, int cores, std::size_t points);

/// Told as the points go on, from the thread that called.
struct LocalWatch {
    /// Ended so far, and in parts what is under way: 3.4 points.
    std::function<void(double points)> progressed;
    std::function<void(const std::string&)> noted;
};

/// Runs the points that `next` hands out on processes of this machine, each in a worker (see
/// worker.hpp); the folder must be prepared. A point whose worker dies is tried again, in the end
/// recorded as killed. Returns false if `stop` was set before all had ended: then points under way
/// have left their state. Throws OutputError where the folder cannot be written, and
/// std::runtime_error where no worker starts.
/// Takes memory for the workers only, whatever the number of points.
bool run_points(const std::string& folder, const Study&,
                const std::function<std::optional<std::size_t>()>& next, const LocalSettings&,
                const LocalWatch&, const std::atomic<bool>& stop);

} // namespace rille::engine
