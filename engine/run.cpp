// SPDX-License-Identifier: Apache-2.0
#include "engine/run.hpp"

#include "engine/metrics.hpp"
#include "engine/number_text.hpp"
#include "engine/symmetric_part.hpp"
#include "geometry/band.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <limits>

namespace rille::engine {
namespace {

/// The state of the front as files and metrics want it, on the whole period, with the arrivals if
/// they can be had. The simulation is that of `part`.
SurfaceState snapshot(const Case& part, Simulation& simulation, bool solved = true) {
    SurfaceState state;
    state.time_s = simulation.time_s();
    const std::size_t step = std::min(simulation.step_index(), part.steps.size() - 1);
    state.step = part.steps[step].name;
    state.surface = simulation.surface();
    state.grown = simulation.films();
    state.displacement = simulation.displacement_errors();
    if (solved)
        fill_state(state, part, simulation.arrivals());
    else
        state.material = simulation.materials();
    return unfolded(part, state);
}

HistoryRow history_row(const Case& the_case, const Case& part, Simulation& simulation,
                       const std::string& step, double step_start_s) {
    const fluxes::SurfaceStep& solved = simulation.arrivals();
    HistoryRow row;
    row.time_s = simulation.time_s();
    row.step = step;
    row.step_time_s = simulation.time_s() - step_start_s;
    row.time_step_s = simulation.last_dt_s();
    row.sub_steps = simulation.health().sub_steps;
    for (const auto& response : solved.response) {
        row.highest_rate = std::max(row.highest_rate, response.rate);
        row.lowest_rate = std::min(row.lowest_rate, response.rate);
    }
    row.elements = static_cast<int>(simulation.surface().size());
    row.iterations = solved.iterations;
    row.residual = solved.residual;
    row.redistance_shift = simulation.health().largest_redistance_shift;
    row.rays = simulation.health().rays;
    row.lost_rays = simulation.health().lost_rays;
    row.largest_move = simulation.last_move_cells();
    measure_row(the_case, geometry::unfold(part.fold, part.domain, simulation.surface()).surface,
                row);
    return row;
}

std::string isolated_warning(const IsolatedEvent& event) {
    const bool closed = event.part.kind == geometry::IsolatedPart::Kind::closed_void;
    return std::string(closed ? "a void has closed off" : "a piece of solid has come off") +
           " near x = " + rounded(event.part.centre.x) +
           " nm, z = " + rounded(event.part.centre.z) + " nm, first seen at " +
           rounded(event.time_s) + " s";
}

/// Warnings that a refresh gives rise to, told when they arise and each once.
class Watch {
public:
    Watch(const Case& the_case, RunObserver& observer) : case_(the_case), observer_(observer) {}

    void look(const Simulation& simulation, const HistoryRow& row) {
        const std::size_t told = warnings_.size();
        note(simulation, row);
        for (std::size_t w = told; w < warnings_.size(); ++w)
            observer_.warned(warnings_[w]);
    }
    /// What was told before a run was stopped.
    void recall(const Simulation& simulation, const std::vector<HistoryRow>& history) {
        for (const HistoryRow& row : history)
            note(simulation, row);
    }
    const std::vector<std::string>& warnings() const { return warnings_; }

private:
    void note(const Simulation& simulation, const HistoryRow& row) {
        const auto& isolated = simulation.isolated_parts();
        for (; told_ < isolated.size() && isolated[told_].time_s <= row.time_s; ++told_)
            warnings_.push_back(isolated_warning(isolated[told_]));
        filled_.resize(row.features.size(), 0);
        for (std::size_t f = 0; f < row.features.size(); ++f)
            note_feature(row.features[f], case_.mask.openings[f].name, filled_[f], row.time_s);
    }
    void note_feature(const FeatureRow& feature, const std::string& name, char& filled,
                      double time_s) {
        if (case_.mask.thickness <= 0 || !feature.mask_left) return;
        const double left = *feature.mask_left;
        if (left <= 0 && !mask_gone_) {
            mask_gone_ = true;
            warnings_.push_back("the mask beside " + name + " is used up, first seen at " +
                                rounded(time_s) +
                                " s: from then on the film below it is etched too");
        }
        if (left > 0 && !filled && feature.depth_centre &&
            left + *feature.depth_centre < case_.domain.spacing) {
            filled = 1;
            warnings_.push_back("opening " + name + " is filled to its top, first seen at " +
                                rounded(time_s) + " s");
        }
    }

    const Case& case_;
    RunObserver& observer_;
    std::vector<std::string> warnings_;
    std::size_t told_ = 0;
    bool mask_gone_ = false;
    std::vector<char> filled_; ///< per opening
};

void note_health(const Case& the_case, const Expectation& expected, const Simulation& simulation,
                 RunRecord& record) {
    const Health& health = simulation.health();
    record.steps = simulation.outcomes();
    record.simulated_s = simulation.time_s();
    record.elements = simulation.surface().size();
    record.voxels = simulation.front().band().size();
    record.refreshes = health.refreshes;
    if (health.by_rays > 0)
        record.warnings.push_back(
            "neutrals were exchanged by rays, with sampling error, in " +
            std::to_string(health.by_rays) + " of " + std::to_string(health.refreshes) +
            " refreshes: their exact exchange does not serve a surface that floats, touches itself "
            "or overhangs the open field");
    record.rays = health.rays;
    record.lost_rays = health.lost_rays;
    record.redistance_shift = health.largest_redistance_shift;
    const Timings& t = simulation.timings();
    record.timings = {{"contour", t.extract},
                      {"ray_caster", t.cast},
                      {"direct_ions", t.direct_ions},
                      {"reflected_ions", t.reflected_ions},
                      {"neutrals", t.neutrals},
                      {"kinetics", t.kinetics},
                      {"other_fluxes", t.other_fluxes},
                      {"advance", t.advance},
                      {"carry", t.carry}};
    for (const std::string& warning : charging_warnings(the_case, expected))
        record.warnings.push_back(warning);
}

bool is_insulator(const Case& the_case, int material) {
    return material < static_cast<int>(the_case.insulator.size()) && the_case.insulator[material];
}

} // namespace

Expectation expect(const Case& the_case) {
    return expect(the_case, OpenField(the_case));
}

Expectation expect(const Case& the_case, OpenField field) {
    const double top = field.height();
    const int mask = the_case.mask.thickness > 0 ? the_case.films.front().material : -1;
    Expectation expected;
    std::map<std::string, double> duration;
    for (const RecipeStep& step : the_case.steps) {
        double time = step.end.time_s;
        if (step.end.kind == StepEnd::Kind::share_of_step)
            time = step.end.share * duration[step.end.of_step];
        else if (step.end.kind != StepEnd::Kind::time) {
            const auto film =
                std::find_if(the_case.films.begin(), the_case.films.end(),
                             [&](const geometry::Film& f) { return f.name == step.end.film; });
            time = std::min(step.no_longer_than_s, field.time_to(film->top, step.plasma));
        }
        field.advance(time, step.plasma);
        if (mask >= 0)
            expected.mask_loss_nm += std::max(0.0, field.flat(mask, step.plasma).rate) * time;
        duration[step.name] = time;
        expected.step_s.push_back(time);
        expected.total_s += time;
    }
    expected.depth_nm = top - field.height();
    expected.mask_loss_nm = std::min(expected.mask_loss_nm, the_case.mask.thickness);
    return expected;
}

double Expectation::share(std::size_t index, double of_step) const {
    if (!(total_s > 0)) return (index + of_step) / step_s.size();
    double done = of_step * step_s[index];
    for (std::size_t step = 0; step < index; ++step)
        done += step_s[step];
    return std::min(1.0, done / total_s);
}

std::vector<std::string> charging_warnings(const Case& the_case, const Expectation& expected) {
    std::vector<std::string> warnings;
    double width = std::numeric_limits<double>::infinity();
    for (const auto& opening : the_case.mask.openings)
        width = std::min(width, opening.shape == geometry::Opening::Shape::trench
                                    ? opening.width_x
                                    : std::min(opening.width_x, opening.width_y));
    const double depth = expected.depth_nm;
    bool insulating_above_stop = false, conductor_to_insulator = false;
    for (std::size_t f = the_case.substrate_first; f < the_case.films.size(); ++f) {
        const geometry::Film& film = the_case.films[f];
        const bool insulator = is_insulator(the_case, film.material);
        if (-film.top >= depth) break; // not reached
        if (insulator) insulating_above_stop = true;
        if (f > std::size_t(the_case.substrate_first) && insulator &&
            !is_insulator(the_case, the_case.films[f - 1].material))
            conductor_to_insulator = true;
    }
    const bool insulating_mask =
        the_case.mask.thickness > 0 && is_insulator(the_case, the_case.films[0].material);
    const double aspect = (depth + the_case.mask.thickness) / width;
    const char* effect = ": charging is not modelled; floor rate and clear time are optimistic, "
                         "notching and twisting are not predicted";
    if ((insulating_above_stop || insulating_mask) && aspect > 10)
        warnings.push_back("insulating film or mask above aspect ratio 10 (mask included)" +
                           std::string(effect));
    if (conductor_to_insulator)
        warnings.push_back("a conductor is etched down to an insulator" + std::string(effect));
    return warnings;
}

namespace {

using Clock = std::chrono::steady_clock;

/// A run on its way: what it needs beside the simulation.
struct Course {
    const Case& the_case;
    const Case part; ///< what is computed of it
    RunObserver& observer;
    const std::atomic<bool>& stop;
    Simulation simulation;
    Expectation expected;
    Watch watch;
    RunState state; ///< history, next frame and time spent before are kept here
    Clock::time_point started = Clock::now();

    Course(const Case& c, RunObserver& told, const std::atomic<bool>& stopped)
        : the_case(c), part(symmetric_part(c)), observer(told), stop(stopped), simulation(part),
          expected(expect(c, simulation.open_field())), watch(c, told) {}
    Course(const Case& c, RunObserver& told, const std::atomic<bool>& stopped, const RunState& from)
        : the_case(c), part(symmetric_part(c)), observer(told), stop(stopped),
          simulation(part, from.simulation), expected(expect(c)), watch(c, told), state(from) {
        watch.recall(simulation, state.history);
    }
    double wall_seconds() const {
        return state.wall_seconds + std::chrono::duration<double>(Clock::now() - started).count();
    }
    double frame_interval() const {
        return the_case.frame_interval_s > 0 ? the_case.frame_interval_s : expected.total_s / 10;
    }
    RunState saved() const {
        RunState now = state;
        now.simulation = simulation.save();
        now.wall_seconds = wall_seconds();
        now.program = this_program();
        return now;
    }
};

/// The next time at which arrivals and causes are written along the surface.
double next_arc_data(const Course& run) {
    double next = std::numeric_limits<double>::infinity();
    for (const double time : run.the_case.arc_data_s)
        if (time > run.simulation.time_s() * (1 + 1e-12)) next = std::min(next, time);
    return next;
}

void write_arc_data(Course& run) {
    const std::size_t step = std::min(run.simulation.step_index(), run.the_case.steps.size() - 1);
    const std::string& plasma = run.simulation.arriving_plasma();
    SurfaceFlux flux = unfolded(run.part, surface_flux(run.part, run.simulation, plasma));
    flux.state.step = run.the_case.steps[step].name;
    run.observer.surveyed(flux);
}

/// Measures at the end of a step if a target asks for it; whether it was.
bool measure_step_end(Course& run, std::size_t index) {
    const std::string& step = run.the_case.steps[index].name;
    if (!is_measured_after(run.the_case, step)) return false;
    run.state.after.push_back(
        measure_after(run.the_case, snapshot(run.part, run.simulation), step));
    return true;
}

/// One refresh, told to the observer.
void one_refresh(Course& run) {
    Simulation& simulation = run.simulation;
    const std::size_t index = simulation.step_index();
    const double start_s = simulation.outcomes().empty() ? 0.0 : simulation.outcomes().back().end_s;
    const double arc_data_s = next_arc_data(run);
    simulation.step(std::min(run.state.next_frame_s, arc_data_s));
    std::vector<HistoryRow>& history = run.state.history;
    history.push_back(
        history_row(run.the_case, run.part, simulation, run.the_case.steps[index].name, start_s));
    const double of_step = simulation.step_index() > index ? 1.0 : simulation.step_progress();
    run.watch.look(simulation, history.back());
    run.observer.progressed(simulation, history.back(), run.expected.share(index, of_step));
    if (simulation.time_s() >= arc_data_s * (1 - 1e-12)) write_arc_data(run);
    const bool frame_due = simulation.time_s() >= run.state.next_frame_s * (1 - 1e-12);
    const bool asked = simulation.step_index() > index && measure_step_end(run, index);
    if ((frame_due || asked) && !simulation.finished())
        run.observer.framed(snapshot(run.part, simulation));
    if (frame_due) run.state.next_frame_s += run.frame_interval();
    if (!simulation.finished())
        run.observer.resumable(frame_due || asked, [&] { return run.saved(); });
}

/// Steps to the end of the recipe, or until `stop` is set.
RunResult follow_recipe(Course& run) {
    RunResult result;
    RunRecord& record = result.record;
    Simulation& simulation = run.simulation;
    try {
        if (run.state.history.empty()) {
            run.observer.framed(snapshot(run.part, simulation));
            run.state.next_frame_s = run.frame_interval();
            const auto& times = run.the_case.arc_data_s;
            if (std::find(times.begin(), times.end(), 0.0) != times.end()) write_arc_data(run);
        }
        while (!simulation.finished() && !run.stop)
            one_refresh(run);
        record.status = !simulation.finished()     ? "interrupted"
                        : simulation.all_reached() ? "done"
                                                   : "not cleared";
    } catch (const std::exception& error) {
        record.status = "failed";
        record.failure = error.what();
        result.error = std::current_exception();
    }
    result.last = snapshot(run.part, simulation, record.failure.empty());
    result.shape = simulation.ledger().parts();
    record.warnings = run.watch.warnings();
    note_health(run.the_case, run.expected, simulation, record);
    record.computed = computed_share(run.part.fold);
    record.resumed = run.state.resumed;
    record.wall_seconds = run.wall_seconds();
    // Frames, pictures of progress, the state that is kept, and what is made once at the start.
    record.timings.push_back({"all_else", record.wall_seconds - simulation.timings().sum()});
    result.history = std::move(run.state.history);
    result.after = std::move(run.state.after);
    const auto front =
        std::make_shared<geometry::Front>(geometry::unfold(run.part.fold, simulation.front()));
    result.write_level_set = [front](const std::string& path) { front->write_vdb(path); };
    return result;
}

} // namespace

RunResult run_case(const Case& the_case, RunObserver& observer, const std::atomic<bool>& stop) {
    Course run(the_case, observer, stop);
    return follow_recipe(run);
}

RunResult resume_case(const Case& the_case, const RunState& state, RunObserver& observer,
                      const std::atomic<bool>& stop) {
    Course run(the_case, observer, stop, state);
    ++run.state.resumed;
    RunResult result = follow_recipe(run);
    if (state.program != this_program())
        result.record.warnings.push_back("taken up by another build (" + this_program() +
                                         " after " + state.program +
                                         "): the bits may differ from those of an unbroken run");
    return result;
}

} // namespace rille::engine
