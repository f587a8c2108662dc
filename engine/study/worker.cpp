// SPDX-License-Identifier: Apache-2.0
#include "engine/study/worker.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/line_pipe.hpp"
#include "engine/study/point_run.hpp"

#include <chrono>
#include <condition_variable>
#include <deque>
#include <fmt/format.h>
#include <mutex>
#include <optional>
#include <sstream>
#include <tbb/global_control.h>
#include <thread>
#include <unistd.h>

namespace rille::engine {
namespace {

struct Order {
    std::size_t index = 0;
    int tries = 1;
};

/// Reads orders beside the run, so that `stop` and `threads` are heard in the middle of it.
class Orders {
public:
    Orders(int threads, std::atomic<bool>& stop) : stop_(stop) {
        set_threads(threads);
        reader_ = std::thread([this] { read(); });
    }
    ~Orders() {
        stop_ = true;
        reader_.join();
    }
    /// Waits for the next one; nothing once the worker is to stop.
    std::optional<Order> next() {
        std::unique_lock<std::mutex> lock(mutex_);
        while (orders_.empty() && !stop_)
            changed_.wait_for(lock, std::chrono::milliseconds(100)); // a signal wakes nobody
        if (stop_) return std::nullopt;
        const Order order = orders_.front();
        orders_.pop_front();
        return order;
    }

private:
    void set_threads(int threads) {
        control_.reset();
        control_.emplace(tbb::global_control::max_allowed_parallelism, threads);
    }
    void obey(const std::string& line) {
        std::istringstream words(line);
        std::string what;
        words >> what;
        if (what == "threads") {
            int threads = 1;
            if (words >> threads && threads > 0) set_threads(threads);
        } else if (what == "run") {
            Order order;
            words >> order.index >> order.tries;
            const std::lock_guard<std::mutex> lock(mutex_);
            orders_.push_back(order);
        } else {
            stop_ = true;
        }
        changed_.notify_one();
    }
    void read() {
        LineReader lines(STDIN_FILENO);
        while (!stop_) {
            if (lines.wait(200))
                if (!lines.read()) stop_ = true;
            while (const std::optional<std::string> line = lines.next())
                obey(*line);
        }
        changed_.notify_one();
    }

    std::atomic<bool>& stop_;
    std::optional<tbb::global_control> control_;
    std::mutex mutex_;
    std::condition_variable changed_;
    std::deque<Order> orders_;
    std::thread reader_;
};

/// Answers go where standard output led; what libraries print must not come between them.
int keep_answers_apart() {
    const int answers = dup(STDOUT_FILENO);
    dup2(STDERR_FILENO, STDOUT_FILENO);
    return answers;
}

std::function<void(double)> share_teller(int answers, std::size_t index) {
    auto told = std::chrono::steady_clock::now();
    return [=](double share) mutable {
        const auto now = std::chrono::steady_clock::now();
        if (now - told < std::chrono::milliseconds(200)) return;
        told = now;
        write_line(answers, fmt::format("share {} {:.4f}", index, share));
    };
}

std::string answer_of(std::size_t index, const PointOutcome& outcome) {
    switch (outcome.kind) {
    case PointOutcome::Kind::stopped:
        return fmt::format("stopped {}", index);
    case PointOutcome::Kind::lost:
        return fmt::format("lost {}", index);
    case PointOutcome::Kind::finished:
        break;
    }
    return fmt::format("end {} {:.3f} {}", index, outcome.seconds, outcome.status);
}

} // namespace

int serve_study(const std::string& folder, int threads, std::atomic<bool>& stop) {
    const int answers = keep_answers_apart();
    Orders orders(threads, stop);
    try {
        const StudyAtWork work = open_study(folder);
        write_line(answers, "ready");
        while (const std::optional<Order> order = orders.next()) {
            const PointOutcome outcome = run_point(work, order->index, order->tries, stop,
                                                   share_teller(answers, order->index));
            write_line(answers, answer_of(order->index, outcome));
        }
    } catch (const OutputError& error) {
        write_line(answers, fmt::format("broken {}", error.what()));
        return 5;
    }
    return 0;
}

} // namespace rille::engine
