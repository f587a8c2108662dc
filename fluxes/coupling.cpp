// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupling.hpp"

#include "fluxes/coupled_equations.hpp"
#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <string>

namespace rille::fluxes {
namespace {

using Vector = std::vector<double>;
using Answer = CoupledAnswer;
using Problem = CoupledEquations;
constexpr int max_newton_iterations = 12; ///< 4 to 8 are the rule
constexpr int max_relaxation_steps = 400;
constexpr double sticking_tolerance = 1e-6;
constexpr double flux_tolerance = 1e-8;
constexpr double by_product_tolerance = 1e-11; ///< of the arrivals: atoms are to be conserved

double norm(const Vector& v) {
    double sum = 0;
    for (const double x : v)
        sum += x * x;
    return std::sqrt(sum);
}

struct State {
    Vector x;
    Answer kinetic; ///< what the kinetics answers, without slopes
    Answer met;     ///< what the neutrals meet
    Vector defect;
    double size = 0; ///< of the defect
};

/// Neutrals meet (1 - share) before + share (what the kinetics answers).
struct Blend {
    const Answer& before;
    double share;
};

State evaluate(const Problem& p, Vector x, const Blend& blend) {
    State state;
    state.x = std::move(x);
    state.met = p.answer(-1, state.x, true);
    state.kinetic = {state.met.sticking, state.met.emitted, {}, {}};
    if (blend.share < 1) p.blend(blend.before, blend.share, state.met);
    state.defect = p.defect(-1, state.x, state.met);
    state.size = norm(state.defect);
    return state;
}

/// The longest of step, step / 2, step / 4 ... that brings the defect down; the shortest tried if
/// none does (a kink of the kinetics can raise the defect for one iteration).
State backtrack(const Problem& p, const State& from, const Vector& step, const Blend& blend) {
    State next;
    for (double share = 1; share > 0.02; share *= 0.5) {
        Vector x = from.x;
        for (std::size_t i = 0; i < x.size(); ++i)
            x[i] = std::max(x[i] + share * step[i], p.least());
        next = evaluate(p, std::move(x), blend);
        if (next.size <= from.size) break;
    }
    return next;
}

double largest_change(const Vector& a, const Vector& b) {
    double change = 0;
    for (std::size_t i = 0; i < a.size(); ++i)
        change = std::max(change, std::fabs(a[i] - b[i]));
    return change;
}

double largest_change(const Answer& a, const Answer& b) {
    return std::max(largest_change(a.sticking, b.sticking), largest_change(a.emitted, b.emitted));
}

std::vector<Vector> by_species(const Problem& p, const Vector& x) {
    std::vector<Vector> flux(p.species(), Vector(p.elements()));
    for (std::size_t k = 0; k < p.species(); ++k)
        for (std::size_t e = 0; e < p.elements(); ++e)
            flux[k][e] = std::max(p.unit(k) * x[k * p.elements() + e], 0.0);
    return flux;
}

struct Newton {
    bool converged = false;
    int iterations = 0;
    double change = 1; ///< largest of a sticking in the last iteration
};

/// Newton's method from `state`, which is left where it ended.
Newton newton(const Problem& p, State& state, const Blend& blend, double scale, int most) {
    Newton done;
    const double goal = (p.by_products() ? by_product_tolerance : flux_tolerance) * scale;
    while (done.iterations < most) {
        RILLE_CHECK(std::isfinite(state.size), "kinetics gave a sticking that is not a number");
        // Nothing is gained by solving a step better than Newton's method squares its error.
        const double tolerance = std::clamp(1e-2 * state.size / scale, 1e-9, 1e-3);
        Vector step;
        if (!NewtonStep(p, state.met).solve(-1, state.defect, tolerance, step)) return done;
        State next = backtrack(p, state, step, blend);
        done.change = largest_change(state.met, next.met);
        state = std::move(next);
        ++done.iterations;
        done.converged = done.change < sticking_tolerance && state.size < goal;
        if (done.converged) break;
    }
    return done;
}

/// Follows the relaxation of the sticking towards what the kinetics answers, d s / d tau =
/// kinetics(arrivals(s)) - s, by implicit Euler steps until it is at rest; the steps grow while
/// Newton's method converges in them. A short step is always solvable: the share of the kinetics
/// in it is small, and with fixed sticking the equations are linear. Returns the distance from
/// rest.
double relax(const Problem& p, State& state, double scale, int& iterations) {
    Answer before = state.kinetic;
    double pace = 0.25, longest = 1e4, rest = 1;
    for (int step = 0; step < max_relaxation_steps && rest > sticking_tolerance; ++step) {
        const Blend blend{before, pace / (1 + pace)};
        State next = evaluate(p, state.x, blend);
        const Newton done = newton(p, next, blend, scale, max_newton_iterations);
        iterations += done.iterations;
        if (!done.converged) {
            longest = 0.7 * pace;
            pace *= 0.25;
            continue;
        }
        rest = largest_change(next.kinetic, next.met);
        before = next.met;
        state = std::move(next);
        longest *= 1.05;
        pace = std::min(done.iterations <= 4 ? 2 * pace : pace, longest);
    }
    return rest;
}

/// Arrivals at the answer of a surface that nothing has reached yet.
Vector arrivals_at_bare(const Problem& p) {
    const Vector x(p.unknowns(), 0.0);
    Answer bare = p.answer(-1, x, false);
    p.hold(bare);
    Vector step;
    if (!NewtonStep(p, bare).solve(-1, p.defect(-1, x, bare), 1e-6, step))
        step.assign(x.size(), 1.0);
    return step;
}

} // namespace

CoupledArrivals solve_coupled(const ExchangeOperator& exchange,
                              const std::vector<NeutralSupply>& supply, const AnswerOf& answer,
                              const std::vector<std::vector<double>>& guess) {
    const Problem p(exchange, supply, answer);
    const std::size_t n = p.elements();
    const auto guessed = [&](std::size_t k) {
        return k < guess.size() && guess[k].size() == n && p.unit(k) > 0;
    };
    bool all = true;
    for (std::size_t k = 0; k < p.species(); ++k)
        all = all && guessed(k);
    Vector x = all ? Vector(p.unknowns()) : arrivals_at_bare(p);
    for (std::size_t k = 0; k < p.species(); ++k)
        for (std::size_t e = 0; e < n && guessed(k); ++e)
            x[k * n + e] = guess[k][e] / p.unit(k);
    double scale = std::sqrt(double(p.species())) * norm(exchange.direct());
    scale = std::max(scale, 1e-300);

    CoupledArrivals result;
    const Answer none;
    const Blend kinetics_alone{none, 1};
    const State start = evaluate(p, std::move(x), kinetics_alone);
    State state = start;
    const Newton done = newton(p, state, kinetics_alone, scale, max_newton_iterations);
    result.iterations = done.iterations;
    result.residual = done.change;
    if (!done.converged) {
        state = start;
        result.relaxed = true;
        result.residual = relax(p, state, scale, result.iterations);
        if (result.residual > sticking_tolerance)
            throw NumericsError("transport and kinetics of neutrals did not converge: sticking is "
                                "still off by " +
                                std::to_string(result.residual));
    }
    result.flux = by_species(p, state.x);
    result.batch_flux.resize(batches);
    const NewtonStep last(p, state.met);
    tbb::parallel_for(0, batches, [&](int b) {
        Answer own = p.answer(b, state.x, false);
        const Vector defect = p.defect(b, state.x, own);
        if (norm(defect) < flux_tolerance * scale) { // no ray and no ion of its own
            result.batch_flux[b] = result.flux;
            return;
        }
        Vector step;
        if (!last.solve(b, defect, 1e-4, step)) {
            // Next to a change between two steady states: the answer at fixed sticking stands in.
            p.hold(own);
            RILLE_CHECK(NewtonStep(p, own).solve(b, defect, 1e-4, step), "transport of one batch");
        }
        Vector moved = state.x;
        for (std::size_t i = 0; i < moved.size(); ++i)
            moved[i] = std::max(moved[i] + step[i], p.least());
        result.batch_flux[b] = by_species(p, moved);
    });
    return result;
}

} // namespace rille::fluxes
