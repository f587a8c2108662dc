// SPDX-License-Identifier: Apache-2.0
#include "engine/simulation.hpp"
#include "engine/error_drift.hpp"

#include "engine/arrivals_change.hpp"
#include "engine/sources.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "geometry/between_centres.hpp"
#include "geometry/check.hpp"
#include "geometry/nearest.hpp"
#include "geometry/ray_caster.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <limits>
#include <set>

namespace rille::engine {
namespace {

using geometry::Surface;
using geometry::Vec3;

constexpr double growth_move = 0.5;      // [cells] of a step at most where a film grows
constexpr double shortest_move = 0.0625; // [cells] steps are not halved further
constexpr double no_film_nm = 1e-9;      // thinner grown film counts as none

/// Adds the wall time of its scope to a counter.
class Stopwatch {
public:
    explicit Stopwatch(double& total) : total_(total), start_(Clock::now()) {}
    ~Stopwatch() { total_ += std::chrono::duration<double>(Clock::now() - start_).count(); }
    Stopwatch(const Stopwatch&) = delete;
    Stopwatch& operator=(const Stopwatch&) = delete;

private:
    using Clock = std::chrono::steady_clock;
    double& total_;
    Clock::time_point start_;
};

geometry::Front initial_front(const Case& c) {
    if (c.start) return {c.domain, start_distance(c.domain, *c.start), c.start->low, c.start->high};
    const auto distance = geometry::initial_distance(c.domain, c.mask, c.liner_thickness);
    const double margin = 4 * c.domain.spacing;
    return {c.domain, distance, -margin, c.mask.thickness + c.liner_thickness + margin};
}

/// Film materials that may grow in the run, deepest first: the liner, then what the chemistry
/// deposits, last what by-products build up.
geometry::GrownFilms initial_films(const Case& c, std::size_t elements) {
    geometry::GrownFilms films;
    if (c.liner_thickness > 0) {
        films.material.push_back(c.liner_material);
        films.thickness.emplace_back(elements, c.liner_thickness);
    }
    std::vector<int> materials = fluxes::deposited_materials(c.mechanism);
    const std::vector<int> returning = fluxes::redeposited_materials(c.mechanism);
    std::stable_partition(materials.begin(), materials.end(), [&](int m) {
        return !std::binary_search(returning.begin(), returning.end(), m);
    });
    for (const int material : materials)
        if (std::find(films.material.begin(), films.material.end(), material) ==
            films.material.end()) {
            films.material.push_back(material);
            films.thickness.emplace_back(elements, 0.0);
        }
    return films;
}

/// Which films grow mixed with the film below: what by-products build up, in any order.
std::vector<char> mixed_films(const Case& c, const std::vector<int>& films) {
    const std::vector<int> returning = fluxes::redeposited_materials(c.mechanism);
    const auto returns = [&](std::size_t f) {
        return (f > 0 || c.liner_thickness <= 0) &&
               std::binary_search(returning.begin(), returning.end(), films[f]);
    };
    std::vector<char> mixed(films.size(), 0);
    for (std::size_t f = 1; f < films.size(); ++f)
        mixed[f] = returns(f - 1) && returns(f);
    return mixed;
}

/// What lies below each of these films at the start: the drawn shape, and the liner on it.
geometry::FilmBases initial_bases(const Case& c) {
    std::vector<std::function<double(const Vec3&)>> below;
    const std::vector<int> materials = initial_films(c, 0).material;
    const std::size_t films = materials.size();
    if (c.start) {
        below.assign(films, films > 0 ? start_distance(c.domain, *c.start) : nullptr);
        return {c.domain, below, c.start->low, c.start->high, mixed_films(c, materials)};
    }
    for (std::size_t f = 0; f < films; ++f)
        below.push_back(
            geometry::initial_distance(c.domain, c.mask, f == 0 ? 0.0 : c.liner_thickness));
    return {c.domain, below, 0, c.mask.thickness + c.liner_thickness, mixed_films(c, materials)};
}

double highest(const Surface& surface) {
    double z = -std::numeric_limits<double>::infinity();
    for (const Vec3& v : surface.vertices)
        z = std::max(z, v.z);
    return z;
}

} // namespace

void check_lost_rays(const Health& health) {
    constexpr std::uint64_t few = 100;
    constexpr double lost_ray_share = 1e-5; // a run that loses more is not trusted
    if (health.lost_rays <= few || health.lost_rays <= lost_ray_share * health.rays) return;
    throw NumericsError(std::to_string(health.lost_rays) + " of " + std::to_string(health.rays) +
                        " rays ended neither on the surface nor in the open");
}

Simulation::Simulation(const Case& the_case)
    : case_(the_case), stack_(the_case.films), front_(initial_front(the_case)),
      surface_(geometry::extract_surface(front_)), films_(initial_films(the_case, surface_.size())),
      bases_(initial_bases(the_case)), open_field_(the_case), ledger_(the_case) {
    displacement_errors_.assign(fluxes::batches, std::vector<double>(surface_.size(), 0.0));
    ledger_.stand(0, surface_);
    begin_step();
}

fluxes::MaterialsInReach Simulation::materials_in_reach(const Surface& surface,
                                                        const geometry::GrownFilms& films) const {
    fluxes::MaterialsInReach reach;
    reach.first.push_back(0);
    const double h = case_.domain.spacing;
    for (std::size_t e = 0; e < surface.size(); ++e) {
        std::vector<int> found; // outermost first, each material once
        const auto add = [&found](int material) {
            if (std::find(found.begin(), found.end(), material) == found.end())
                found.push_back(material);
        };
        double grown = 0;
        for (std::size_t f = films.material.size(); f-- > 0;)
            if (films.thickness[f][e] > no_film_nm) {
                add(films.material[f]);
                grown += films.thickness[f][e];
            }
        const double z = surface.centre[e].z - surface.normal[e].z * (grown + 1e-3 * h);
        add(stack_.material_at(z));
        // What a step of half a cell, or a tilt of the normal, may meet; and what may grow.
        const int last = stack_.film_at(z - 1.5 * h);
        for (int film = stack_.film_at(z + 1.5 * h); film <= last; ++film)
            add(stack_.films()[film].material);
        for (const int material : films.material)
            add(material);
        reach.material.insert(reach.material.end(), found.begin(), found.end());
        reach.first.push_back(static_cast<int>(reach.material.size()));
    }
    return reach;
}

std::vector<int> Simulation::materials() const {
    const auto reach = materials_in_reach(surface_, films_);
    std::vector<int> outermost(surface_.size());
    for (std::size_t e = 0; e < surface_.size(); ++e)
        outermost[e] = reach.material[reach.first[e]];
    return outermost;
}

fluxes::SurfaceStep Simulation::solve(const Surface& surface, const geometry::GrownFilms& films,
                                      const fluxes::SurfaceStep* previous) {
    std::unique_ptr<geometry::RayCaster> caster;
    {
        const Stopwatch watch(timings_.cast);
        caster = std::make_unique<geometry::RayCaster>(case_.domain, surface,
                                                       highest(surface) + 2 * case_.domain.spacing);
    }
    const Stopwatch watch(timings_.other_fluxes);
    const std::string& plasma = case_.steps[plasma_step_].plasma;
    fluxes::Sampling sampling;
    sampling.rays_per_element = case_.rays_per_element;
    sampling.ions_per_species = case_.ions_per_species;
    sampling.seed = case_.seed;
    sampling.refresh = refresh_++;
    sampling.causes = true;
    auto solved = fluxes::solve_surface(
        case_.domain, surface, *caster, materials_in_reach(surface, films), case_.mechanism,
        case_.reflection, sources_of(case_, case_.plasmas.at(plasma)), sampling, previous);
    const auto& part = solved.seconds;
    timings_.direct_ions += part.direct_ions;
    timings_.reflected_ions += part.reflected_ions;
    timings_.neutrals += part.neutrals;
    timings_.kinetics += part.kinetics;
    timings_.other_fluxes -= part.direct_ions + part.reflected_ions + part.neutrals + part.kinetics;
    neck_limit_s_ = neck_limit(surface, solved, *caster);
    health_.rays += caster->traced();
    health_.lost_rays += caster->lost();
    health_.largest_sticking_residual =
        std::max(health_.largest_sticking_residual, solved.residual);
    ++health_.refreshes;
    if (!solved.inexact.empty()) ++health_.by_rays;
    check_lost_rays(health_);
    return solved;
}

double Simulation::neck_limit(const Surface& surface, const fluxes::SurfaceStep& solved,
                              const geometry::RayCaster& caster) const {
    double limit = std::numeric_limits<double>::infinity();
    for (std::size_t e = 0; e < surface.size(); ++e) {
        const double growth = -solved.response[e].rate;
        if (growth <= 0) continue;
        if (case_.refresh_move > growth_move)
            limit = std::min(limit, growth_move * case_.domain.spacing / growth);
        const auto hit = caster.trace(surface.centre[e], surface.normal[e], static_cast<int>(e));
        if (hit.kind != geometry::Hit::Kind::surface) continue;
        limit = std::min(limit, std::max(hit.distance, case_.domain.spacing) / (8 * growth));
    }
    return limit;
}

const fluxes::SurfaceStep& Simulation::arrivals() {
    if (!present_valid_) {
        const auto previous = std::move(present_);
        before_solve_ = {previous.neutral, refresh_, health_};
        present_ = solve(surface_, films_, &previous);
        present_valid_ = true;
    }
    return present_;
}

Simulation::Trial Simulation::try_advance(const fluxes::SurfaceStep& step, double time,
                                          double max_move) {
    Trial trial{front_, {}, films_, {}, {}, {}};
    // Where nothing grows at the element's own normal it may at another: then the outermost film.
    std::vector<int> growth(surface_.size(), static_cast<int>(films_.material.size()) - 1);
    for (std::size_t e = 0; e < growth.size(); ++e)
        for (std::size_t f = 0; f < films_.material.size(); ++f)
            if (films_.material[f] == step.growth_material[e]) growth[e] = static_cast<int>(f);
    {
        const Stopwatch watch(timings_.advance);
        geometry::AdvanceLimits limits;
        limits.time = time;
        limits.max_move = max_move;
        trial.report = geometry::advance(trial.front, surface_, step.rates, stack_, trial.films,
                                         growth, -std::numeric_limits<double>::infinity(), limits);
    }
    const Stopwatch watch(timings_.extract);
    trial.surface = geometry::extract_surface(trial.front);
    return trial;
}

/// Takes what lies on the present surface along to where a trial ends.
void Simulation::carry(const Trial& trial, const std::vector<Carried>& carried) {
    const Stopwatch watch(timings_.carry);
    std::vector<geometry::SurfaceField> fields;
    for (const Carried& c : carried)
        for (auto& value : c.values)
            fields.push_back({"", c.how, std::move(value)});
    std::vector<geometry::SurfaceField*> all;
    for (auto& field : fields)
        all.push_back(&field);
    geometry::carry_fields(surface_, trial.surface, trial.report.moved, case_.domain, all);
    auto field = fields.begin();
    for (const Carried& c : carried)
        for (auto& value : c.values)
            value = std::move((field++)->value);
}

std::vector<geometry::BetweenCentres> Simulation::feet(const Trial& trial) const {
    const geometry::NearestElement nearest(case_.domain, trial.surface);
    std::vector<geometry::BetweenCentres> feet(surface_.size());
    for (std::size_t e = 0; e < feet.size(); ++e) {
        const Vec3 foot = surface_.centre[e] - surface_.normal[e] * trial.report.moved[e];
        feet[e] = geometry::between_centres(case_.domain, trial.surface, nearest(foot), foot);
    }
    return feet;
}

/// Replaces each rate by its mean with the rate at the end of the predicted step (Heun's method),
/// found at the foot of the element's displacement.
void Simulation::average_rates(fluxes::SurfaceStep& now, const fluxes::SurfaceStep& later,
                               const std::vector<geometry::BetweenCentres>& feet) const {
    const std::size_t angles = now.rates.angles.size();
    if (later.rates.angles.size() != angles) return;
    for (std::size_t e = 0; e < surface_.size(); ++e) {
        const geometry::BetweenCentres& there = feet[e];
        if (there.element < 0) continue;
        for (int r = now.rates.first_row[e]; r < now.rates.first_row[e + 1]; ++r) {
            const int other = later.rates.row(there.element, now.rates.material[r]);
            if (other < 0) continue;
            const int beside =
                there.partner < 0 ? -1 : later.rates.row(there.partner, now.rates.material[r]);
            const double share = beside < 0 ? 0 : there.share;
            const double* near = &later.rates.table[other * angles];
            const double* next = share != 0 ? &later.rates.table[beside * angles] : near;
            for (std::size_t k = 0; k < angles; ++k) {
                double& rate = now.rates.table[r * angles + k];
                rate = 0.5 * (rate + geometry::value_between(near[k], next[k], share));
            }
        }
        for (std::size_t b = 0; b < now.rate_batch.size(); ++b)
            now.rate_batch[b][e] =
                0.5 * (now.rate_batch[b][e] + later.rate_batch[b][there.element]);
    }
}

/// Steps are halved and doubled, so that noise seldom decides about their length.
bool Simulation::pace(double change, double share) {
    const int before = pace_;
    const int most = std::max(0, int(std::lround(std::log2(case_.refresh_move / shortest_move))));
    if (change > case_.refresh_change)
        pace_ = std::min(pace_ + 1, most);
    else if (change < 0.4 * case_.refresh_change && share > 0.9)
        pace_ = std::max(pace_ - 1, 0);
    return change > 10 * case_.refresh_change && pace_ > before;
}

Simulation::Trial Simulation::heun(double time_limit) {
    const fluxes::SurfaceStep& now = arrivals();
    const double limit = std::min(time_limit, neck_limit_s_);
    for (double before = HUGE_VAL;;) {
        const double longest = std::ldexp(case_.refresh_move, -pace_);
        Trial predicted = try_advance(now, limit, longest);
        geometry::GrownFilms films = predicted.films;
        fluxes::SurfaceStep start; // what the solve starts from
        start.ion_tables = now.ion_tables;
        start.neutral = now.neutral;
        carry(predicted, {{geometry::Carry::per_area, films.thickness},
                          {geometry::Carry::intensive, start.neutral}});
        const fluxes::SurfaceStep later = solve(predicted.surface, films, &start);
        std::vector<geometry::BetweenCentres> there;
        {
            const Stopwatch watch(timings_.carry);
            there = feet(predicted);
        }
        const double change = arrivals_change(case_.domain, surface_, now, later, there);
        // A jump of the arrivals does not shrink with the step.
        if (pace(change, predicted.report.largest_move / longest) && change < 0.7 * before) {
            before = change;
            ++health_.shortened;
            continue;
        }
        average_rates(present_, later, there);
        Trial trial = try_advance(present_, predicted.report.time, 2 * longest);
        trial.at_start = ledger_.read(surface_, now.cause, now.supply);
        trial.at_end = ledger_.read(predicted.surface, later.cause, later.supply);
        return trial;
    }
}

void Simulation::accept(Trial&& trial, const fluxes::SurfaceStep& step) {
    const double dt = trial.report.time;
    add_errors(step.rate_batch, dt, displacement_errors_);
    if (case_.domain.planar_contour())
        drift_along_contour(surface_, step.rates, dt, displacement_errors_);
    carry(trial, {{geometry::Carry::per_area, trial.films.thickness},
                  {geometry::Carry::intensive, present_.neutral},
                  {geometry::Carry::intensive, displacement_errors_}});
    films_.thickness = std::move(trial.films.thickness);
    ledger_.add(dt, trial.at_start, trial.at_end);
    front_ = std::move(trial.front);
    surface_ = std::move(trial.surface);
    ledger_.stand(time_s_ + dt, surface_);
    {
        const Stopwatch watch(timings_.carry);
        bases_.follow(front_);
        bases_.settle(front_, surface_, films_);
    }
    present_valid_ = false;
    open_field_.advance(dt, recipe().plasma);
    time_s_ += dt;
    last_dt_s_ = dt;
    last_move_cells_ = trial.report.largest_move;
    health_.sub_steps += trial.report.sub_steps;
    health_.largest_redistance_shift =
        std::max(health_.largest_redistance_shift, trial.report.redistance_shift);
    find_isolated();
}

void Simulation::find_isolated() {
    const auto apart = [](int chain) { return chain != 0; };
    if (std::none_of(surface_.chain.begin(), surface_.chain.end(), apart)) return;
    const auto parts = case_.fold.any()
                           ? geometry::find_isolated_parts(
                                 geometry::unfold(case_.fold, front_),
                                 geometry::unfold(case_.fold, case_.domain, surface_).surface)
                           : geometry::find_isolated_parts(front_, surface_);
    for (const auto& part : parts) {
        const double size = std::cbrt(part.volume) + 4 * case_.domain.spacing;
        const bool known =
            std::any_of(isolated_.begin(), isolated_.end(), [&](const IsolatedEvent& event) {
                return event.part.kind == part.kind &&
                       (event.part.centre - part.centre).length() < size;
            });
        if (!known) isolated_.push_back({part, time_s_});
    }
}

} // namespace rille::engine
