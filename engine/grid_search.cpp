// SPDX-License-Identifier: Apache-2.0
#include "engine/grid_search.hpp"

#include "engine/case_build.hpp"
#include "engine/case_file.hpp"
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <limits>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

using nlohmann::json;
using Kind = GridSearch::Next::Kind;

constexpr double grid_part = 0.9;     ///< of the error asked for that the grid may take
constexpr double sampling_part = 0.4; ///< ... that sampling is brought down to
constexpr int most_cells_across_extruded = 200, most_cells_across_full = 64; ///< of the narrowest
constexpr int fewest_companion_cells = 4;
constexpr double away_cost = 0.03; ///< [cells] of edges elsewhere, for one cell more or less
constexpr int most_ions = 1 << 22;

double narrowest_opening(const Case& c) {
    double width = c.domain.width_x();
    for (const geometry::Opening& opening : c.mask.openings)
        width = std::min({width, opening.width_x,
                          opening.shape == geometry::Opening::Shape::trench ? opening.width_x
                                                                            : opening.width_y});
    return width;
}

int near(const Case& c, int cells) {
    if (c.domain.planar_contour()) return cells;
    return common_cells(c.domain.width_x(), c.domain.width_y(), c.domain.width_x() / cells);
}

} // namespace

GridSearch::GridSearch(const Case& asked, const std::string& saved, const std::string& path)
    : asked_(asked) {
    if (saved.empty()) return;
    try {
        const json written = json::parse(saved);
        for (const json& run : written.at("runs"))
            runs_.push_back(grid_run_from_json(run));
    } catch (const json::exception& error) {
        throw OutputError(path, "cannot read the runs on other grids", error.what());
    }
}

double GridSearch::wall_seconds() const {
    double sum = 0;
    for (const GridRun& run : runs_)
        sum += run.wall_seconds;
    return sum;
}

std::string GridSearch::text() const {
    json runs = json::array();
    for (const GridRun& run : runs_)
        runs.push_back(grid_run_json(run));
    return json{{"what", "the same case on other grids; grid errors come from these"},
                {"runs", runs}}
               .dump(2) +
           "\n";
}

const GridRun* GridSearch::find(int cells, int ions, bool is_main) const {
    const auto found = std::find_if(runs_.begin(), runs_.end(), [&](const GridRun& run) {
        return run.cells == cells && (is_main ? run.is_main && run.ions == ions : true);
    });
    return found == runs_.end() ? nullptr : &*found;
}

/// Largest distance [cells] of where the edges of openings lie between the nodes of two grids.
double GridSearch::edge_offset(int cells, int others) const {
    const geometry::Domain& domain = asked_.domain;
    double largest = 0;
    const auto count = [&](double edge) {
        const double more = (cells - others) * edge / domain.width_x(); // cells up to the edge
        largest = std::max(largest, std::fabs(more - std::round(more)));
    };
    for (const geometry::Opening& opening : asked_.mask.openings)
        for (const double side : {-0.5, 0.5}) {
            count(opening.centre_x + side * opening.width_x - domain.x_min());
            if (domain.symmetry == geometry::Symmetry::full &&
                opening.shape != geometry::Opening::Shape::trench)
                count(opening.centre_y + side * opening.width_y - domain.y_min());
        }
    return largest;
}

/// Of the grids with about `wanted` cells one on which the edges of openings lie as on that of
/// `cells`.
int GridSearch::alike(int cells, double wanted) const {
    const int middle = static_cast<int>(std::lround(wanted));
    const int reach = std::max(2, middle / 12);
    int best = middle;
    double least = std::numeric_limits<double>::infinity();
    for (int each = middle - reach; each <= middle + reach; ++each) {
        const double cost = edge_offset(cells, each) + away_cost * std::abs(each - middle);
        if (cost < least - 1e-9) {
            least = cost;
            best = each;
        }
    }
    return best;
}

std::vector<int> GridSearch::companion_cells(int cells) const {
    const int half = static_cast<int>(std::lround(0.5 * cells));
    const int alike_half = alike(cells, 0.5 * cells);
    const int first = std::clamp(half - 1, alike_half - 3, alike_half);
    std::vector<int> list;
    for (const int wanted :
         {first, first + 1, first + 2, first + 3, alike(cells, std::sqrt(0.5) * cells)}) {
        const int found = near(asked_, wanted);
        if (found >= fewest_companion_cells && found < cells &&
            std::find(list.begin(), list.end(), found) == list.end())
            list.push_back(found);
    }
    return list;
}

std::vector<GridRun> GridSearch::companions_of(int cells) const {
    std::vector<GridRun> list;
    for (const int each : companion_cells(cells))
        if (const GridRun* run = find(each, 0, false)) {
            list.push_back(*run);
            list.back().edge_offset = edge_offset(cells, each);
        }
    return list;
}

CdError GridSearch::predicted(int cells) const {
    const std::vector<GridRun> companions = companions_of(cells);
    const GridRun* finest = nullptr;
    for (const GridRun& run : companions)
        if (!run.metrics.empty() && (!finest || run.cells > finest->cells)) finest = &run;
    if (!finest) return {std::numeric_limits<double>::infinity(), 0, 0};
    std::vector<Metric> metrics = finest->metrics;
    assess_grid_error(metrics, asked_.domain.width_x() / cells, false, companions);
    return largest_cd_error(metrics);
}

CdError GridSearch::error_of(const GridRun& main) const {
    std::vector<Metric> metrics = main.metrics;
    assess_grid_error(metrics, main.spacing, true, companions_of(main.cells));
    return largest_cd_error(metrics);
}

int GridSearch::finest_cells() const {
    const int across =
        asked_.domain.planar_contour() ? most_cells_across_extruded : most_cells_across_full;
    return near(asked_,
                static_cast<int>(across * asked_.domain.width_x() / narrowest_opening(asked_)));
}

/// By the error, taken to fall with the spacing; sqrt(2) to 4 times as many.
int GridSearch::finer(int cells, double error) const {
    const double factor =
        std::clamp(error / (0.8 * grid_part * asked_.accuracy_cd_nm), std::sqrt(2.0), 4.0);
    const int found = near(asked_, static_cast<int>(std::lround(factor * cells)));
    return std::min(std::max(found, cells + 1), finest_cells());
}

GridSearch::Choice GridSearch::choose() const {
    int cells = asked_.domain.cells_x, ions = asked_.ions_per_species;
    while (compares()) {
        const std::vector<int> companions = companion_cells(cells);
        for (std::size_t i = 0; i < companions.size(); ++i)
            if (!find(companions[i], 0, false))
                return {Kind::companion, companions[i], asked_.ions_per_species,
                        static_cast<int>(i) + 1, static_cast<int>(companions.size())};
        const GridRun* main = find(cells, ions, true);
        const double asked = asked_.accuracy_cd_nm;
        if (asked <= 0 || (main && !main->failure.empty())) break;
        const bool can_refine = cells < finest_cells();
        if (!main) {
            const CdError error = predicted(cells);
            if (error.grid <= grid_part * asked || error.total == 0 || !can_refine) break;
            cells = finer(cells, error.grid);
            continue;
        }
        const CdError error = error_of(*main);
        if (error.total <= asked) break;
        const double wanted = std::pow(error.sampling / (sampling_part * asked), 2);
        if (wanted > 1 && ions < most_ions && (error.grid <= grid_part * asked || !can_refine)) {
            const double more = std::min(std::max(2.0, wanted) * ions, double(most_ions));
            ions = 8 * static_cast<int>(std::ceil(more / 8));
        } else if (can_refine) {
            cells = finer(cells, error.grid);
        } else {
            break;
        }
    }
    const bool done = find(cells, ions, true) != nullptr;
    return {done ? Kind::end : Kind::main, cells, ions, 0, 0};
}

Case GridSearch::with_grid(int cells, int ions, bool is_main) const {
    if (is_main && asked_.accuracy_cd_nm > 0) {
        const double rays = double(asked_.rays_per_element) * ions / asked_.ions_per_species;
        Case chosen =
            parse_case(asked_.shown_yaml, asked_.file, ".",
                       {"accuracy.spacing=" + shortest(asked_.domain.width_x() / cells) + " nm",
                        "sampling.ions_per_species=" + std::to_string(ions),
                        "sampling.rays_per_point=" + std::to_string(8 * std::lround(rays / 8))});
        chosen.file = asked_.file;
        return chosen;
    }
    Case other = asked_;
    other.domain.cells_x = cells;
    other.domain.spacing = asked_.domain.width_x() / cells;
    if (!other.domain.planar_contour())
        other.domain.cells_y =
            static_cast<int>(std::lround(asked_.domain.width_y() / other.domain.spacing));
    return other;
}

GridSearch::Next GridSearch::next() const {
    const Choice choice = choose();
    return {choice.kind, with_grid(choice.cells, choice.ions, choice.kind != Kind::companion),
            choice.companion, choice.companions};
}

void GridSearch::add(const Next& which, const Metrics& metrics, const std::string& failure,
                     double wall_seconds) {
    const bool is_main = which.kind != Kind::companion;
    const geometry::Domain& domain = which.the_case.domain;
    runs_.push_back({domain.cells_x, domain.spacing, which.the_case.ions_per_species, is_main,
                     failure, metrics.metrics, wall_seconds});
}

void GridSearch::assess(const Case& main, Metrics& metrics) const {
    if (!compares()) return;
    assess_grid_error(metrics.metrics, main.domain.spacing, true,
                      companions_of(main.domain.cells_x));
    metrics.targets = judge_targets(main, metrics);
}

bool GridSearch::is_met() const {
    if (asked_.accuracy_cd_nm <= 0) return true;
    const Choice choice = choose();
    const GridRun* main = find(choice.cells, choice.ions, true);
    return main && main->failure.empty() && error_of(*main).total <= asked_.accuracy_cd_nm;
}

std::string GridSearch::summary() const {
    if (asked_.accuracy_cd_nm <= 0) return "";
    const Choice choice = choose();
    const GridRun* main = find(choice.cells, choice.ions, true);
    if (!main || !main->failure.empty()) return "";
    const CdError error = error_of(*main);
    return fmt::format("accuracy: CDs to ±{:.2g} nm (grid {:.2g}, sampling {:.2g}) at a spacing of "
                       "{:.3g} nm, {} cells; asked was {:.3g} nm: {}",
                       error.total, error.grid, error.sampling, main->spacing, main->cells,
                       asked_.accuracy_cd_nm, is_met() ? "met" : "not met");
}

} // namespace rille::engine
