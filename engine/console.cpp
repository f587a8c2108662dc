// SPDX-License-Identifier: Apache-2.0
#include "engine/console.hpp"

#include "engine/case.hpp"
#include "engine/caution.hpp"
#include "engine/number_text.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <fmt/format.h>
#include <ostream>
#include <unistd.h>

namespace rille::engine {
namespace {

constexpr double bar_interval_s = 0.1, line_interval_s = 10;
constexpr int bar_cells = 24;

double steady_seconds() {
    using Clock = std::chrono::steady_clock;
    return std::chrono::duration<double>(Clock::now().time_since_epoch()).count();
}

} // namespace

Progress::Progress(std::ostream& out, Style style, std::function<double()> seconds)
    : out_(out), style_(style), seconds_(seconds ? std::move(seconds) : steady_seconds),
      start_(seconds_()) {}

Progress::Style Progress::style_for(int file_descriptor, bool quiet) {
    if (quiet) return Style::quiet;
    return isatty(file_descriptor) ? Style::bar : Style::lines;
}

std::string Progress::line(const ProgressState& state, double elapsed) const {
    const double share = std::clamp(state.share, 0.0, 1.0);
    std::string text = fmt::format("{:3.0f} %  ", std::floor(100 * share));
    text +=
        state.words.empty() ? fmt::format("{} {:.1f} s", state.step, state.time_s) : state.words;
    if (state.depth_nm && state.words.empty())
        text += fmt::format("  depth {:.1f} nm", *state.depth_nm);
    // A first guess from less than this would jump about.
    if (share >= 1) return text;
    const double own = share - state.share_before;
    if (own > 0.005) text += "  left " + duration_text(elapsed * (1 - share) / own);
    return text;
}

void Progress::update(const ProgressState& state) {
    last_ = state;
    if (style_ == Style::quiet) return;
    const double now = seconds_();
    const double interval = style_ == Style::bar ? bar_interval_s : line_interval_s;
    if (any_ && now - shown_ < interval) return;
    any_ = true;
    shown_ = now;
    if (style_ == Style::lines) {
        out_ << line(state, now - start_) << '\n' << std::flush;
        return;
    }
    const int full = static_cast<int>(std::clamp(state.share, 0.0, 1.0) * bar_cells);
    std::string bar(full, '#');
    bar.resize(bar_cells, '.');
    out_ << "\r[" << bar << "] " << line(state, now - start_) << "\x1b[K" << std::flush;
}

void Progress::note(const std::string& text) {
    if (style_ == Style::quiet) return;
    out_ << (style_ == Style::bar ? "\r\x1b[K" : "") << text << '\n' << std::flush;
    shown_ = -1e300; // the bar was wiped
}

void Progress::finish() {
    if (style_ == Style::quiet || !any_) return;
    shown_ = -1e300; // the last state is always shown
    update(last_);
    if (style_ == Style::bar) out_ << '\n' << std::flush;
}

std::string duration_text(double seconds) {
    const long long whole = std::llround(std::max(0.0, std::min(seconds, 1e12)));
    if (whole < 60) return fmt::format("{} s", whole);
    if (whole < 3600) return fmt::format("{} min {:02} s", whole / 60, whole % 60);
    return fmt::format("{} h {:02} min", whole / 3600, whole / 60 % 60);
}

std::string closing_text(const Case& c, const RunRecord& record, const Metrics& metrics,
                         const std::string& folder) {
    std::string text =
        c.title + ": " + record.status + " in " + duration_text(record.wall_seconds) + "\n";
    for (const StepOutcome& step : record.steps)
        text += fmt::format("  {}: {} to {} s, {}\n", step.name, rounded(step.start_s),
                            rounded(step.end_s), step.reason);
    text += metrics_table(c, metrics);
    if (!record.accuracy.empty()) text += record.accuracy + "\n";
    for (const auto* list : {&c.warnings, &record.warnings})
        for (const std::string& warning : *list)
            text += "warning: " + warning + "\n";
    if (record.status == "interrupted")
        text += "rille resume " + folder + " takes it up from here\n";
    return text + standing_line(c) + "\nresults in " + folder + "\n" + caution + "\n";
}

} // namespace rille::engine
