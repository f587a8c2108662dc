// SPDX-License-Identifier: Apache-2.0
#include "engine/study/local_study.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/point_run.hpp"
#include "engine/study/worker_process.hpp"

#include <algorithm>
#include <fmt/format.h>
#include <memory>
#include <poll.h>
#include <sstream>
#include <vector>

namespace rille::engine {
namespace {

constexpr int poll_ms = 100;

class LocalRun {
public:
    LocalRun(const std::string& folder, const Study& study,
             const std::function<std::optional<std::size_t>()>& next, const LocalSettings& settings,
             const LocalWatch& watch, const std::atomic<bool>& stop)
        : folder_(folder), study_(study), next_(next), settings_(settings), watch_(watch),
          stop_(stop) {}

    bool go() {
        while (true) {
            if (stop_) ask_to_stop();
            hand_out();
            if (workers_.empty()) break;
            listen();
            tell();
        }
        if (!broken_.empty()) throw OutputError(folder_, "the study cannot go on", broken_);
        return !stop_;
    }

private:
    using Workers = std::vector<std::unique_ptr<WorkerProcess>>;

    /// The next point to do: one to be tried again first. Finished ones are passed over.
    std::optional<WorkerProcess::Job> take() {
        if (!again_.empty()) {
            const WorkerProcess::Job job = again_.back();
            again_.pop_back();
            return job;
        }
        while (!exhausted_) {
            const std::optional<std::size_t> index = next_();
            if (!index)
                exhausted_ = true;
            else if (!PointFolder::is_finished(folder_, point_name(study_, *index)))
                return WorkerProcess::Job{*index, 1, 0};
        }
        return std::nullopt;
    }

    /// Gives work to whoever has none, starts workers while there is work for them, and lets those
    /// go for whom there is none.
    void hand_out() {
        if (stopping_) return;
        for (auto& worker : workers_)
            if (!worker->job)
                if (const auto job = take()) worker->run(*job);
        while (workers_.size() < static_cast<std::size_t>(settings_.workers)) {
            const auto job = take();
            if (!job) break;
            workers_.push_back(
                std::make_unique<WorkerProcess>(settings_.program, folder_, settings_.threads));
            workers_.back()->run(*job);
        }
        workers_.erase(std::remove_if(workers_.begin(), workers_.end(),
                                      [](const auto& worker) { return !worker->job; }),
                       workers_.end());
        share_threads();
    }

    /// The threads of workers that are no longer needed go to those that are.
    void share_threads() {
        if (!exhausted_ || workers_.empty()) return;
        const int all = settings_.workers * settings_.threads;
        const int each = std::max(settings_.threads, all / static_cast<int>(workers_.size()));
        for (auto& worker : workers_)
            worker->set_threads(each);
    }

    void ask_to_stop() {
        if (stopping_) return;
        stopping_ = true;
        for (auto& worker : workers_)
            worker->stop();
    }

    void listen() {
        std::vector<pollfd> ears;
        for (const auto& worker : workers_)
            ears.push_back({worker->answers(), POLLIN, 0});
        if (poll(ears.data(), ears.size(), poll_ms) <= 0) return;
        for (std::size_t w = ears.size(); w-- > 0;) {
            if (ears[w].revents == 0) continue;
            const bool lives = workers_[w]->read();
            while (const auto line = workers_[w]->next_line())
                hear(*workers_[w], *line);
            if (lives) continue;
            bury(*workers_[w]);
            workers_.erase(workers_.begin() + static_cast<std::ptrdiff_t>(w));
        }
    }

    void hear(WorkerProcess& worker, const std::string& line) {
        std::istringstream words(line);
        std::string what;
        std::size_t index = 0;
        words >> what;
        if (what == "ready") {
            worker.is_ready = true;
        } else if (what == "broken") {
            broken_ = line.substr(line.find(' ') + 1);
            worker.job.reset();
            ask_to_stop();
        } else if (worker.job && words >> index && index == worker.job->index) {
            if (what == "share") words >> worker.job->share;
            if (what == "lost") try_again(*worker.job, "its folder was taken away");
            if (what == "end") ++ended_;
            if (what == "end" || what == "lost") worker.job.reset();
            if (what == "stopped") worker.job->share = -1; // the end of the worker follows
        }
    }

    /// A worker that ended while it had work: its point is tried again unless all are to stop.
    void bury(WorkerProcess& worker) {
        const std::string how = worker.end();
        if (stopping_ || !worker.job) return;
        if (!worker.is_ready && how.rfind("ended", 0) == 0)
            throw std::runtime_error("a worker " + how + " before it began");
        try_again(*worker.job, "its process was " + how);
    }

    void try_again(WorkerProcess::Job job, const std::string& why) {
        clear_ended_points(folder_);
        const std::string name = point_name(study_, job.index);
        if (job.tries > settings_.retries_killed) {
            record_killed_point(folder_, study_, job.index, job.tries,
                                fmt::format("{}, {} times in all", why, job.tries));
            note(fmt::format("point {} is given up: {}", name, why));
            ++ended_;
            return;
        }
        note(fmt::format("point {} is tried again: {}", name, why));
        again_.push_back({job.index, job.tries + 1, 0});
    }

    void note(const std::string& text) const {
        if (watch_.noted) watch_.noted(text);
    }

    void tell() const {
        if (!watch_.progressed) return;
        double points = static_cast<double>(ended_);
        for (const auto& worker : workers_)
            if (worker->job) points += std::max(0.0, worker->job->share);
        watch_.progressed(points);
    }

    const std::string& folder_;
    const Study& study_;
    const std::function<std::optional<std::size_t>()>& next_;
    const LocalSettings& settings_;
    const LocalWatch& watch_;
    const std::atomic<bool>& stop_;
    Workers workers_;
    std::vector<WorkerProcess::Job> again_; ///< at most one a worker
    bool exhausted_ = false, stopping_ = false;
    std::size_t ended_ = 0;
    std::string broken_;
};

} // namespace

LocalSettings local_settings(int workers, int threads, int cores, std::size_t points) {
    LocalSettings settings;
    cores = std::max(1, cores);
    settings.threads = threads > 0 ? threads : workers > 0 ? std::max(1, cores / workers) : 1;
    settings.workers = workers > 0 ? workers : std::max(1, cores / settings.threads);
    const std::size_t most = std::max<std::size_t>(1, points);
    if (static_cast<std::size_t>(settings.workers) > most) {
        // With fewer points than workers each gets more threads, unless the number was asked for.
        settings.workers = static_cast<int>(most);
        if (threads <= 0) settings.threads = std::max(settings.threads, cores / settings.workers);
    }
    return settings;
}

bool run_points(const std::string& folder, const Study& study,
                const std::function<std::optional<std::size_t>()>& next,
                const LocalSettings& settings, const LocalWatch& watch,
                const std::atomic<bool>& stop) {
    return LocalRun(folder, study, next, settings, watch, stop).go();
}

} // namespace rille::engine
