// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupling.hpp"

#include "fluxes/krylov.hpp"
#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <string>

namespace rille::fluxes {
namespace {

using Vector = std::vector<double>;
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

/// What the surface answers to arrivals, in the units of the problem.
struct Answer {
    Vector sticking;
    Vector emitted; ///< empty without by-products
    /// slope[(e * K + k) * K + l] = d(s_k x_k - emitted_k) / d(x_l) at element e
    Vector slope;
};

/// The equations in units of the open fluxes, or of the largest emission of a by-product; species
/// after species: x[k * n + e].
class Problem {
public:
    Problem(const ExchangeOperator& exchange, const std::vector<NeutralSupply>& supply,
            const AnswerOf& answer)
        : exchange_(exchange), answer_(answer), n_(exchange.size()), species_(supply.size()) {
        for (const NeutralSupply& s : supply) {
            unit_.push_back(s.open);
            source_.push_back(1);
            by_products_ = by_products_ || s.given_off;
        }
        if (by_products_) set_units(supply);
    }

    std::size_t unknowns() const { return n_ * species_; }
    std::size_t species() const { return species_; }
    std::size_t elements() const { return n_; }
    bool by_products() const { return by_products_; }

    /// The answer at x; slopes if asked.
    Answer answer(int batch, const Vector& x, bool slopes) const {
        Answer a;
        a.sticking.resize(unknowns());
        if (by_products_) a.emitted.resize(unknowns());
        if (slopes) a.slope.resize(n_ * species_ * species_);
        tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n_, 64), [&](const auto& range) {
            for (std::size_t e = range.begin(); e != range.end(); ++e)
                at_element(e, batch, x, a);
        });
        return a;
    }

    /// out_k = A (in_k), every species.
    void transport(int batch, const Vector& in, Vector& out) const {
        for (std::size_t k = 0; k < species_; ++k)
            exchange_.apply(batch, in.data() + k * n_, out.data() + k * n_);
    }

    /// source d + A ((1 - s) x + emitted) - x
    Vector defect(int batch, const Vector& x, const Answer& a) const {
        Vector leaving(unknowns()), out(unknowns());
        for (std::size_t i = 0; i < x.size(); ++i)
            leaving[i] = (1 - a.sticking[i]) * x[i];
        for (std::size_t i = 0; i < a.emitted.size(); ++i)
            leaving[i] += a.emitted[i];
        transport(batch, leaving, out);
        const auto& direct = exchange_.direct(batch);
        for (std::size_t i = 0; i < x.size(); ++i)
            out[i] += source_[i / n_] * direct[i % n_] - x[i];
        return out;
    }

    /// The answer (1 - share) before + share a.
    void blend(const Answer& before, double share, Answer& a) const {
        for (double& part : a.slope)
            part *= share;
        for (std::size_t i = 0; i < a.emitted.size(); ++i)
            a.emitted[i] = (1 - share) * before.emitted[i] + share * a.emitted[i];
        for (std::size_t e = 0; e < n_; ++e)
            for (std::size_t k = 0; k < species_; ++k) {
                const std::size_t i = k * n_ + e;
                const double fixed = (1 - share) * before.sticking[i];
                a.sticking[i] = fixed + share * a.sticking[i];
                a.slope[(e * species_ + k) * species_ + k] += fixed;
            }
    }

    /// Solves (I - A (I - slope)) step = defect; whether that went well.
    bool newton_step(int batch, const Vector& slope, const Vector& defect, double tolerance,
                     Vector& step) const {
        step = defect;
        Vector leaving(unknowns()), arrived(unknowns());
        const std::size_t K = species_;
        const auto matrix = [&](const double* in, double* out) {
            for (std::size_t e = 0; e < n_; ++e)
                for (std::size_t k = 0; k < K; ++k) {
                    double value = in[k * n_ + e];
                    for (std::size_t l = 0; l < K; ++l)
                        value -= slope[(e * K + k) * K + l] * in[l * n_ + e];
                    leaving[k * n_ + e] = value;
                }
            transport(batch, leaving, arrived);
            for (std::size_t i = 0; i < arrived.size(); ++i)
                out[i] = in[i] - arrived[i];
        };
        return solve_linear(matrix, defect, step, tolerance).converged;
    }

    double unit(std::size_t k) const { return unit_[k]; }
    /// Least arrival allowed. An exact exchange spreads what arrives by parabolas, which may pass
    /// below 0 where next to nothing arrives; other neutrals come from the open everywhere.
    double least() const { return by_products_ ? -HUGE_VAL : 0; }

private:
    /// By-products are measured by their largest emission where none of them or of the other
    /// neutrals arrives, or the others as in the open.
    void set_units(const std::vector<NeutralSupply>& supply) {
        std::vector<double> largest(species_, 0.0);
        const std::array<double, max_species> none{};
        std::array<double, max_species> open{};
        for (std::size_t k = 0; k < species_; ++k)
            open[k] = supply[k].open;
        for (std::size_t e = 0; e < n_; ++e)
            for (const auto& neutrals : {none, open}) {
                const NeutralAnswer a = answer_(int(e), -1, neutrals.data());
                for (std::size_t k = 0; k < species_; ++k)
                    largest[k] = std::max(largest[k], a.emitted[k]);
            }
        for (std::size_t k = 0; k < species_; ++k) {
            if (!supply[k].given_off) continue;
            unit_[k] = std::max(supply[k].open, largest[k]);
            if (!(unit_[k] > 0)) unit_[k] = 1;
            source_[k] = supply[k].open / unit_[k];
        }
    }

    void at_element(std::size_t e, int batch, const Vector& x, Answer& a) const {
        std::array<double, max_species> neutrals{};
        for (std::size_t k = 0; k < species_; ++k)
            neutrals[k] = std::max(unit_[k] * x[k * n_ + e], 0.0);
        const NeutralAnswer here = answer_(int(e), batch, neutrals.data());
        for (std::size_t k = 0; k < species_; ++k)
            a.sticking[k * n_ + e] = here.sticking[k];
        for (std::size_t k = 0; k < species_ && by_products_; ++k)
            a.emitted[k * n_ + e] = here.emitted[k] / unit_[k];
        if (a.slope.empty()) return;
        for (std::size_t l = 0; l < species_; ++l) {
            const double at = x[l * n_ + e], more = at + std::max(1e-6 * at, 1e-12);
            auto moved = neutrals;
            moved[l] = std::max(unit_[l] * more, 0.0);
            const NeutralAnswer there = answer_(int(e), batch, moved.data());
            for (std::size_t k = 0; k < species_; ++k) {
                const double xk = x[k * n_ + e];
                const double bend = (there.sticking[k] - here.sticking[k]) / (more - at) * xk;
                double& slope = a.slope[(e * species_ + k) * species_ + l];
                slope = bend + (k == l ? there.sticking[k] : 0.0);
                if (by_products_)
                    slope -= (there.emitted[k] - here.emitted[k]) / (unit_[k] * (more - at));
            }
        }
    }

    const ExchangeOperator& exchange_;
    const AnswerOf& answer_;
    std::vector<double> unit_, source_; ///< per species; source: open flux in these units
    std::size_t n_, species_;
    bool by_products_ = false;
};

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
    state.kinetic = {state.met.sticking, state.met.emitted, {}};
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
        if (!p.newton_step(-1, state.met.slope, state.defect, tolerance, step)) return done;
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

/// `a` with slopes as if it did not change with the arrivals.
void hold(const Problem& p, Answer& a) {
    const Answer fixed = a;
    a.slope.assign(p.unknowns() * p.species(), 0.0);
    p.blend(fixed, 0, a);
}

/// Arrivals at the answer of a surface that nothing has reached yet.
Vector arrivals_at_bare(const Problem& p) {
    const Vector x(p.unknowns(), 0.0);
    Answer bare = p.answer(-1, x, false);
    hold(p, bare);
    Vector step;
    if (!p.newton_step(-1, bare.slope, p.defect(-1, x, bare), 1e-6, step))
        step.assign(x.size(), 1.0);
    return step;
}

} // namespace

CoupledArrivals solve_coupled(const ExchangeOperator& exchange,
                              const std::vector<NeutralSupply>& supply, const AnswerOf& answer,
                              const std::vector<std::vector<double>>& guess) {
    const Problem p(exchange, supply, answer);
    const std::size_t n = p.elements();
    Vector x = arrivals_at_bare(p);
    for (std::size_t k = 0; k < guess.size() && k < p.species(); ++k)
        for (std::size_t e = 0; e < n && guess[k].size() == n && p.unit(k) > 0; ++e)
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
    tbb::parallel_for(0, batches, [&](int b) {
        Answer own = p.answer(b, state.x, false);
        const Vector defect = p.defect(b, state.x, own);
        if (norm(defect) < flux_tolerance * scale) { // no ray and no ion of its own
            result.batch_flux[b] = result.flux;
            return;
        }
        Vector step;
        if (!p.newton_step(b, state.met.slope, defect, 1e-4, step)) {
            // Next to a change between two steady states: the answer at fixed sticking stands in.
            hold(p, own);
            RILLE_CHECK(p.newton_step(b, own.slope, defect, 1e-4, step), "transport of one batch");
        }
        Vector moved = state.x;
        for (std::size_t i = 0; i < moved.size(); ++i)
            moved[i] = std::max(moved[i] + step[i], p.least());
        result.batch_flux[b] = by_species(p, moved);
    });
    return result;
}

} // namespace rille::fluxes
