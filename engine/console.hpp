// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/metrics.hpp"
#include "engine/run_record.hpp"

#include <functional>
#include <iosfwd>
#include <optional>
#include <string>

namespace rille::engine {

/// Where a run stands.
struct ProgressState {
    double share = 0;  ///< of the whole run, [0, 1]
    double time_s = 0; ///< simulated
    std::string step;
    std::optional<double> depth_nm; ///< of the first feature
    std::string words = {};         ///< shown instead of step, time and depth unless empty
    double share_before = 0;        ///< done before this clock started: by an earlier start
};

/// Tells how a run goes on: a bar that renews itself on a terminal, a line now and then elsewhere,
/// or nothing.
class Progress {
public:
    enum class Style { bar, lines, quiet };

    /// `seconds` is a clock (tests bring their own). The stream must outlive this object.
    Progress(std::ostream&, Style, std::function<double()> seconds = {});
    /// The style that suits the stream behind a file descriptor.
    static Style style_for(int file_descriptor, bool quiet);

    void update(const ProgressState&);
    /// A line of its own, at once; the bar goes on below it.
    void note(const std::string&);
    /// Leaves the bar as it stands last, on a line of its own.
    void finish();

private:
    std::string line(const ProgressState&, double elapsed) const;

    std::ostream& out_;
    Style style_;
    std::function<double()> seconds_;
    double start_ = 0, shown_ = 0;
    bool any_ = false;
    ProgressState last_;
};

/// "42 s", "3 min 05 s", "2 h 10 min".
std::string duration_text(double seconds);

/// What a finished run says: how the steps ended, the metrics with their verdicts, the warnings,
/// the folder, the standing of the parameters and the caution.
std::string closing_text(const Case&, const RunRecord&, const Metrics&, const std::string& folder);

} // namespace rille::engine
