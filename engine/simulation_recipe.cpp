// SPDX-License-Identifier: Apache-2.0
// How a run follows its recipe: when a step begins, how long it may go on, how it ends.
#include "engine/simulation.hpp"

#include "engine/metrics.hpp"
#include "engine/number_text.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::engine {
namespace {

constexpr double touching = 1e-6; // [cells] a front this near to a film has reached it
constexpr double forever = std::numeric_limits<double>::infinity();

bool by_profile(const StepEnd& end) {
    return (end.kind == StepEnd::Kind::reaches || end.kind == StepEnd::Kind::cleared) &&
           end.at != "open field";
}

bool by_open_field(const StepEnd& end) {
    return (end.kind == StepEnd::Kind::reaches || end.kind == StepEnd::Kind::cleared) &&
           end.at == "open field";
}

double film_top(const Case& c, const std::string& name) {
    for (const geometry::Film& film : c.films)
        if (film.name == name) return film.top;
    throw InternalError("unknown film " + name);
}

} // namespace

void Simulation::begin_step() {
    if (finished()) return;
    step_start_s_ = time_s_;
    // Longer steps than half a cell only once the arrivals have been seen to change little.
    pace_ = std::clamp(static_cast<int>(std::lround(std::log2(2 * case_.refresh_move))), 0, 2);
    start_distance_ = by_profile(recipe().end) ? distance_to_goal(surface_) : 0.0;
}

double Simulation::step_end_time() const {
    const StepEnd& end = recipe().end;
    switch (end.kind) {
    case StepEnd::Kind::time:
        return step_start_s_ + end.time_s;
    case StepEnd::Kind::share_of_step:
        return step_start_s_ + end.share * duration_s_.at(end.of_step);
    case StepEnd::Kind::reaches:
    case StepEnd::Kind::cleared:
        break;
    }
    return step_start_s_ + recipe().no_longer_than_s;
}

double Simulation::distance_to_goal(const geometry::Surface& surface) const {
    const StepEnd& end = recipe().end;
    const auto film = std::find_if(case_.films.begin(), case_.films.end(),
                                   [&](const geometry::Film& f) { return f.name == end.film; });
    RILLE_CHECK(film != case_.films.end(), "unknown film " + end.film);
    const auto& openings = case_.mask.openings;
    const auto opening = std::find_if(openings.begin(), openings.end(),
                                      [&](const geometry::Opening& o) { return o.name == end.at; });
    RILLE_CHECK(opening != openings.end(), "unknown place " + end.at);
    const geometry::FeatureSite site = feature_sites(case_)[opening - openings.begin()];
    const auto floor = geometry::floor_of(case_.domain, surface, site);
    if (!floor) return std::numeric_limits<double>::infinity();
    double z = floor->centre.value;
    if (end.kind == StepEnd::Kind::cleared)
        z = std::max({z, floor->left_edge.value, floor->right_edge.value});
    // A film that holds still stops the front on its top, to round-off.
    return z - film->top - touching * case_.domain.spacing;
}

/// Given a trial that overshoots the goal, finds the time within the step at which the goal is met
/// (to 1e-3 of the step, on the sub-cell surface) and returns the trial that ends there.
Simulation::Trial Simulation::land_on_goal(Trial&& beyond, const fluxes::SurfaceStep& step) {
    double early = 0, late = beyond.report.time;
    double above = distance_to_goal(surface_), below = distance_to_goal(beyond.surface);
    const double tolerance = 2e-4 * late;
    Trial best = std::move(beyond);
    for (int n = 0; n < 40 && late - early > tolerance; ++n) {
        const double share = std::isfinite(above) ? above / (above - below) : 0.5;
        // Secant, kept away from the ends so that the bracket shrinks from both sides.
        const double between = n % 3 == 2 ? 0.5 : std::clamp(share, 1e-4, 1 - 1e-4);
        const double time = early + between * (late - early);
        Trial trial = try_advance(step, time, 2 * case_.refresh_move);
        const double distance = distance_to_goal(trial.surface);
        if (distance <= 0) {
            trial.at_start = std::move(best.at_start);
            trial.at_end = std::move(best.at_end);
            best = std::move(trial);
            late = time;
            below = distance;
        } else {
            early = time;
            above = distance;
        }
        if (std::fabs(below) < 1e-6 * case_.domain.spacing) break;
    }
    return best;
}

void Simulation::step(double no_later_than_s) {
    RILLE_CHECK(!finished(), "the recipe is done");
    if (recipe().plasma != case_.steps[plasma_step_].plasma) present_valid_ = false;
    plasma_step_ = step_index_;
    const StepEnd end = recipe().end;
    const double last = step_end_time();
    double open_field_time = forever;
    if (by_open_field(end))
        open_field_time = time_s_ + open_field_.time_to(film_top(case_, end.film), recipe().plasma);
    if (by_profile(end) && distance_to_goal(surface_) <= 0) return end_step(true);
    const double until = std::min({last, open_field_time, no_later_than_s});
    const double rounding = 1e-12 * until;
    if (until - time_s_ > rounding) {
        Trial trial = heun(until - time_s_);
        const bool met = by_profile(end) && distance_to_goal(trial.surface) <= 0;
        if (met) trial = land_on_goal(std::move(trial), present_);
        accept(std::move(trial), present_);
        if (met) return end_step(true);
    }
    if (by_open_field(end) && time_s_ >= open_field_time - rounding)
        end_step(true);
    else if (time_s_ >= last - rounding)
        end_step(!by_profile(end) && !by_open_field(end));
}

void Simulation::end_step(bool reached) {
    const RecipeStep& step = recipe();
    const bool timed = !by_profile(step.end) && !by_open_field(step.end);
    const bool clearing = step.end.kind == StepEnd::Kind::cleared;
    const std::string place = step.end.at == "open field" ? step.end.at : step.end.at + " centre";
    const std::string goal = step.end.film + (clearing ? " over " + step.end.at : " at " + place);
    const std::string how = timed ? "time"
                            : reached
                                ? (clearing ? "cleared down to " : "reached ") + goal
                                : (clearing ? "did not clear down to " : "did not reach ") + goal +
                                      " within " + shortest(step.no_longer_than_s) + " s";
    all_reached_ = all_reached_ && reached;
    outcomes_.push_back({step.name, step_start_s_, time_s_, how});
    duration_s_[step.name] = time_s_ - step_start_s_;
    ++step_index_;
    begin_step();
    if (!reached && step.must_end) throw NumericsError("step " + step.name + ": " + how);
}

double Simulation::step_progress() const {
    if (finished()) return 1.0;
    const double by_time =
        (time_s_ - step_start_s_) / std::max(1e-300, step_end_time() - step_start_s_);
    if (!by_profile(recipe().end) || !(start_distance_ > 0)) return std::clamp(by_time, 0.0, 1.0);
    const double by_depth = 1.0 - distance_to_goal(surface_) / start_distance_;
    return std::clamp(std::max(by_time, by_depth), 0.0, 1.0);
}

} // namespace rille::engine
