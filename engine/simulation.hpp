// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "engine/open_field.hpp"
#include "engine/run_record.hpp"
#include "engine/shape_ledger.hpp"
#include "fluxes/surface_step.hpp"
#include "geometry/between_centres.hpp"
#include "geometry/film_bases.hpp"
#include "geometry/front.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/topology.hpp"

#include <cstdint>
#include <map>
#include <memory>
#include <string>
#include <vector>

namespace rille::engine {

/// Seconds of wall time by phase of the run.
struct Timings {
    double extract = 0, cast = 0, advance = 0, carry = 0;
    double direct_ions = 0, reflected_ions = 0, neutrals = 0, kinetics = 0;
    double other_fluxes = 0; ///< what they are asked with: materials in reach, sources, necks

    /// Of finding the arrivals and rates on one surface after the other.
    double solves() const {
        return cast + direct_ions + reflected_ions + neutrals + kinetics + other_fluxes;
    }
    double sum() const { return extract + solves() + advance + carry; }
};

/// Counters of everything that could quietly go wrong.
struct Health {
    std::uint64_t rays = 0, lost_rays = 0;
    double largest_redistance_shift = 0; ///< [cells]
    double largest_sticking_residual = 0;
    int refreshes = 0, sub_steps = 0;
    int by_rays = 0;   ///< refreshes whose neutrals had no exact exchange where symmetry allows one
    int shortened = 0; ///< steps done again because the arrivals changed too much in them
};

/// A run is not trusted, and stops, once more than 100 rays, and more than 1e-5 of all, are lost:
/// throws NumericsError.
void check_lost_rays(const Health&);

/// A void that closed off or a piece that came off, and when it was first seen.
struct IsolatedEvent {
    geometry::IsolatedPart part;
    double time_s = 0;
};

/// A run in progress: the front, what rides on it, and where the recipe stands. One call of step()
/// is one refresh of the arrivals.
class Simulation {
public:
    explicit Simulation(const Case&);
    /// The simulation as `save` left it under the same case: it goes on to the same bits. Throws
    /// NumericsError for a text that is no such state.
    Simulation(const Case&, const std::string& saved);
    /// The whole state between two steps.
    std::string save() const;

    bool finished() const { return step_index_ >= case_.steps.size(); }
    /// Advances by one refresh, to the end of the recipe step at most, and not beyond
    /// `no_later_than` [s of simulated time] (so that outputs fall on their times). Throws
    /// NumericsError.
    void step(double no_later_than_s);

    double time_s() const { return time_s_; }
    double last_dt_s() const { return last_dt_s_; }
    double last_move_cells() const { return last_move_cells_; }
    std::size_t step_index() const { return step_index_; }
    const std::vector<StepOutcome>& outcomes() const { return outcomes_; }
    /// False once a step ran into its limit before it reached what it was to reach.
    bool all_reached() const { return all_reached_; }
    const geometry::Front& front() const { return front_; }
    const geometry::Surface& surface() const { return surface_; }
    const geometry::GrownFilms& films() const { return films_; }
    /// Displacement error of the elements by batch: [batch][element], nm, along -normal.
    const std::vector<std::vector<double>>& displacement_errors() const {
        return displacement_errors_;
    }
    /// Outermost material of each element.
    std::vector<int> materials() const;
    /// Arrivals and rates on the present surface under the plasma of the present (or last) step;
    /// after a step has ended still under its own plasma until the next one begins to etch.
    const fluxes::SurfaceStep& arrivals();
    /// The plasma of those arrivals.
    const std::string& arriving_plasma() const { return case_.steps[plasma_step_].plasma; }
    /// Arrivals on the present surface under the named plasma, path by path and batch by batch,
    /// with the tallies and surfaces of `mechanism`. Leaves the run as it is.
    struct Examined {
        fluxes::SurfaceStep step;
        std::uint64_t rays = 0, lost_rays = 0;
    };
    Examined examine(const fluxes::Mechanism& mechanism, const std::string& plasma) const;
    const OpenField& open_field() const { return open_field_; }
    const Health& health() const { return health_; }
    const Timings& timings() const { return timings_; }
    const std::vector<IsolatedEvent>& isolated_parts() const { return isolated_; }
    /// What has made the shape so far.
    const ShapeLedger& ledger() const { return ledger_; }
    /// Share of the present recipe step that is done, in [0, 1], as far as can be told.
    double step_progress() const;

private:
    /// The state after a tried advance.
    struct Trial {
        geometry::Front front;
        geometry::Surface surface;
        geometry::GrownFilms films; ///< on the elements of the surface before the advance
        geometry::AdvanceReport report;
        ShapeLedger::Readings at_start, at_end; ///< of the causes
    };
    /// Lists what changes from step to step, for saving and reading back.
    template <class Archive, class Self>
    static void visit(Archive&, Self&);
    const RecipeStep& recipe() const { return case_.steps[step_index_]; }
    fluxes::MaterialsInReach materials_in_reach(const geometry::Surface&,
                                                const geometry::GrownFilms&) const;
    fluxes::SurfaceStep solve(const geometry::Surface&, const geometry::GrownFilms&,
                              const fluxes::SurfaceStep* previous);
    Trial try_advance(const fluxes::SurfaceStep&, double time, double max_move);
    Trial heun(double time_limit);
    /// Longest step [s] that leaves narrowing necks resolved: an eighth of the time in which the
    /// growth on one side alone would close the gap (gaps below one cell count as one cell); and
    /// growth of half a cell where the front may move farther.
    double neck_limit(const geometry::Surface&, const fluxes::SurfaceStep&,
                      const geometry::RayCaster&) const;
    struct Carried {
        geometry::Carry how;
        std::vector<std::vector<double>>& values; ///< each by elements
    };
    void carry(const Trial&, const std::vector<Carried>&);
    /// Where each element's displacement in a trial ends on the surface after it.
    std::vector<geometry::BetweenCentres> feet(const Trial&) const;
    void average_rates(fluxes::SurfaceStep& now, const fluxes::SurfaceStep& later,
                       const std::vector<geometry::BetweenCentres>& feet) const;
    /// Chooses the length of the next step from the change of the arrivals in this one, `share` of
    /// the longest that it might have been. Whether this one may have been far too long.
    bool pace(double change, double share);
    void accept(Trial&&, const fluxes::SurfaceStep&);
    void find_isolated();
    double distance_to_goal(const geometry::Surface&) const;
    double step_end_time() const;
    Trial land_on_goal(Trial&& beyond, const fluxes::SurfaceStep&);
    void end_step(bool reached);
    void begin_step();

    const Case& case_;
    geometry::Stack stack_;
    geometry::Front front_;
    geometry::Surface surface_;
    geometry::GrownFilms films_;
    geometry::FilmBases bases_;                            ///< one per grown film
    std::vector<std::vector<double>> displacement_errors_; ///< [batch][element]
    /// Of the present surface if valid; else neutral alone, from where the next solve starts.
    fluxes::SurfaceStep present_;
    bool present_valid_ = false;
    /// What the solve of the present arrivals started from: it is done again after a resume.
    struct BeforeSolve {
        std::vector<std::vector<double>> neutral;
        std::uint64_t refresh = 0;
        Health health;
    } before_solve_;
    double neck_limit_s_ = 0;     ///< of the last surface that was solved
    int pace_ = 0;                ///< steps are refresh_move / 2^pace_ long at most
    std::size_t plasma_step_ = 0; ///< recipe step whose plasma shapes the arrivals
    OpenField open_field_;
    std::vector<StepOutcome> outcomes_;
    std::map<std::string, double> duration_s_; ///< of finished steps
    std::vector<IsolatedEvent> isolated_;
    ShapeLedger ledger_;
    double time_s_ = 0, last_dt_s_ = 0, last_move_cells_ = 0, step_start_s_ = 0;
    double start_distance_ = 0; ///< distance to the goal when the step began [nm]
    std::size_t step_index_ = 0;
    bool all_reached_ = true;
    std::uint64_t refresh_ = 0;
    Health health_;
    Timings timings_;
};

} // namespace rille::engine
