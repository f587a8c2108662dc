// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "engine/grid_error.hpp"

#include <atomic>
#include <functional>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// Which grids a case is run on: the one that is asked for alone; with companions that bound its
/// error; or, under `accuracy`, finer and finer ones until the CDs are as sure as was asked.
///
/// What to do next follows from the runs done so far and from nothing else, so a search that was
/// stopped goes on to the same end from `text()`.
class GridSearch {
public:
    /// `saved` is what `text()` gave earlier for the same case, or empty. Throws OutputError (with
    /// `path`) if it is not that.
    explicit GridSearch(const Case& asked, const std::string& saved = "",
                        const std::string& path = "");

    /// Whether more than the grid that is asked for has a part in this.
    bool compares() const { return asked_.accuracy_cd_nm > 0 || asked_.assess_grid_error; }
    struct Next {
        enum class Kind {
            companion, ///< run it for its metrics alone
            main,      ///< run it with all outputs
            end        ///< the main run of `the_case` is the result
        };
        Kind kind = Kind::end;
        Case the_case;
        int companion = 0, companions = 0; ///< this is the so-maniest of so many
    };
    Next next() const;
    /// Tells what a run of `next()` has given, or why it failed.
    void add(const Next&, const Metrics&, const std::string& failure, double wall_seconds);

    /// Fills the grid errors of a main run's metrics, and judges the targets with them.
    void assess(const Case& main, Metrics&) const;
    /// Whether the CDs of the last main run are as sure as was asked; true where nothing was.
    bool is_met() const;
    /// What the search has come to, for the log; empty where nothing was compared.
    std::string summary() const;

    double wall_seconds() const; ///< of all runs so far
    /// The evidence as JSON: every run with its metrics.
    std::string text() const;

private:
    struct Choice {
        Next::Kind kind = Next::Kind::end;
        int cells = 0, ions = 0, companion = 0, companions = 0;
    };
    Choice choose() const;
    int finer(int cells, double error) const;
    int finest_cells() const;
    double edge_offset(int cells, int others) const;
    int alike(int cells, double wanted) const;
    std::vector<int> companion_cells(int cells) const;
    const GridRun* find(int cells, int ions, bool is_main) const;
    std::vector<GridRun> companions_of(int cells) const;
    CdError predicted(int cells) const;
    CdError error_of(const GridRun& main) const;
    Case with_grid(int cells, int ions, bool is_main) const;

    Case asked_;
    std::vector<GridRun> runs_;
};

/// Told while companions run.
struct GridWatch {
    std::function<void(const std::string& words, double share)> progressed;
    std::function<void(const std::string& line)> noted;
    std::function<void(const std::string& text)> save; ///< keeps the evidence so far
};
/// Runs the companions that are due; what comes next then: a main run, or the end. Nothing if
/// `stop` was set on the way.
std::optional<GridSearch::Next> run_companions(GridSearch&, const GridWatch&,
                                               const std::atomic<bool>& stop);

} // namespace rille::engine
