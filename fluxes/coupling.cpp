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

double norm(const Vector& v) {
    double sum = 0;
    for (const double x : v)
        sum += x * x;
    return std::sqrt(sum);
}

/// The equations in units of the open fluxes, species after species: x[k * n + e].
class Problem {
public:
    Problem(const ExchangeOperator& exchange, std::vector<double> open, const StickingOf& sticking)
        : exchange_(exchange), open_(std::move(open)), sticking_(sticking), n_(exchange.size()),
          species_(open_.size()) {}

    std::size_t unknowns() const { return n_ * species_; }
    std::size_t species() const { return species_; }
    std::size_t elements() const { return n_; }

    /// Sticking s and, if asked, loss[(e * K + k) * K + l] = d(s_k x_k) / d(x_l).
    void evaluate(int batch, const Vector& x, Vector& s, Vector* loss) const {
        s.resize(unknowns());
        if (loss) loss->resize(n_ * species_ * species_);
        tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n_, 64), [&](const auto& range) {
            for (std::size_t e = range.begin(); e != range.end(); ++e)
                at_element(e, batch, x, s, loss);
        });
    }

    /// out_k = A (in_k), every species.
    void transport(int batch, const Vector& in, Vector& out) const {
        for (std::size_t k = 0; k < species_; ++k)
            exchange_.apply(batch, in.data() + k * n_, out.data() + k * n_);
    }

    /// d + A (1 - s) x - x
    Vector defect(int batch, const Vector& x, const Vector& s) const {
        Vector emitted(unknowns()), out(unknowns());
        for (std::size_t i = 0; i < x.size(); ++i)
            emitted[i] = (1 - s[i]) * x[i];
        transport(batch, emitted, out);
        const auto& direct = exchange_.direct(batch);
        for (std::size_t i = 0; i < x.size(); ++i)
            out[i] += direct[i % n_] - x[i];
        return out;
    }

    /// s and loss of the sticking (1 - share) before + share s.
    void blend(const Vector& before, double share, Vector& s, Vector& loss) const {
        for (double& part : loss)
            part *= share;
        for (std::size_t e = 0; e < n_; ++e)
            for (std::size_t k = 0; k < species_; ++k) {
                const std::size_t i = k * n_ + e;
                s[i] = (1 - share) * before[i] + share * s[i];
                loss[(e * species_ + k) * species_ + k] += (1 - share) * before[i];
            }
    }

    /// Solves (I - A (I - loss)) step = defect; whether that went well.
    bool newton_step(int batch, const Vector& loss, const Vector& defect, double tolerance,
                     Vector& step) const {
        step = defect;
        Vector emitted(unknowns()), arrived(unknowns());
        const std::size_t K = species_;
        const auto matrix = [&](const double* in, double* out) {
            for (std::size_t e = 0; e < n_; ++e)
                for (std::size_t k = 0; k < K; ++k) {
                    double value = in[k * n_ + e];
                    for (std::size_t l = 0; l < K; ++l)
                        value -= loss[(e * K + k) * K + l] * in[l * n_ + e];
                    emitted[k * n_ + e] = value;
                }
            transport(batch, emitted, arrived);
            for (std::size_t i = 0; i < arrived.size(); ++i)
                out[i] = in[i] - arrived[i];
        };
        return solve_linear(matrix, defect, step, tolerance).converged;
    }

    double open(std::size_t k) const { return open_[k]; }

private:
    void at_element(std::size_t e, int batch, const Vector& x, Vector& s, Vector* loss) const {
        std::array<double, max_species> neutrals{};
        for (std::size_t k = 0; k < species_; ++k)
            neutrals[k] = open_[k] * x[k * n_ + e];
        const auto here = sticking_(int(e), batch, neutrals.data());
        for (std::size_t k = 0; k < species_; ++k)
            s[k * n_ + e] = here[k];
        if (!loss) return;
        for (std::size_t l = 0; l < species_; ++l) {
            const double at = x[l * n_ + e], more = at + std::max(1e-6 * at, 1e-12);
            auto moved = neutrals;
            moved[l] = open_[l] * more;
            const auto there = sticking_(int(e), batch, moved.data());
            for (std::size_t k = 0; k < species_; ++k) {
                const double xk = x[k * n_ + e];
                const double slope = (there[k] - here[k]) / (more - at) * xk;
                (*loss)[(e * species_ + k) * species_ + l] = slope + (k == l ? there[k] : 0.0);
            }
        }
    }

    const ExchangeOperator& exchange_;
    std::vector<double> open_;
    const StickingOf& sticking_;
    std::size_t n_, species_;
};

struct State {
    Vector x, kinetic; ///< kinetic: the sticking that the kinetics answers
    Vector s;          ///< the sticking that the neutrals meet
    Vector loss, defect;
    double size = 0; ///< of the defect
};

/// Neutrals meet (1 - share) before + share (what the kinetics answers).
struct Blend {
    const Vector& before;
    double share;
};

State evaluate(const Problem& p, Vector x, const Blend& blend) {
    State state;
    state.x = std::move(x);
    p.evaluate(-1, state.x, state.kinetic, &state.loss);
    state.s = state.kinetic;
    if (blend.share < 1) p.blend(blend.before, blend.share, state.s, state.loss);
    state.defect = p.defect(-1, state.x, state.s);
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
            x[i] = std::max(x[i] + share * step[i], 0.0);
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

std::vector<Vector> by_species(const Problem& p, const Vector& x) {
    std::vector<Vector> flux(p.species(), Vector(p.elements()));
    for (std::size_t k = 0; k < p.species(); ++k)
        for (std::size_t e = 0; e < p.elements(); ++e)
            flux[k][e] = p.open(k) * x[k * p.elements() + e];
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
    while (done.iterations < most) {
        RILLE_CHECK(std::isfinite(state.size), "kinetics gave a sticking that is not a number");
        // Nothing is gained by solving a step better than Newton's method squares its error.
        const double tolerance = std::clamp(1e-2 * state.size / scale, 1e-9, 1e-3);
        Vector step;
        if (!p.newton_step(-1, state.loss, state.defect, tolerance, step)) return done;
        State next = backtrack(p, state, step, blend);
        done.change = largest_change(state.s, next.s);
        state = std::move(next);
        ++done.iterations;
        done.converged = done.change < sticking_tolerance && state.size < flux_tolerance * scale;
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
    Vector before = state.kinetic;
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
        rest = largest_change(next.kinetic, next.s);
        before = next.s;
        state = std::move(next);
        longest *= 1.05;
        pace = std::min(done.iterations <= 4 ? 2 * pace : pace, longest);
    }
    return rest;
}

/// Arrivals at the sticking of a surface that nothing has reached yet.
Vector arrivals_at_bare(const Problem& p) {
    Vector x(p.unknowns(), 0.0), s, loss;
    p.evaluate(-1, x, s, nullptr);
    const Vector bare = s;
    loss.assign(x.size() * p.species(), 0.0);
    p.blend(bare, 0, s, loss);
    Vector step;
    if (!p.newton_step(-1, loss, p.defect(-1, x, s), 1e-6, step)) step.assign(x.size(), 1.0);
    return step;
}

} // namespace

CoupledArrivals solve_coupled(const ExchangeOperator& exchange, const std::vector<double>& open,
                              const StickingOf& sticking,
                              const std::vector<std::vector<double>>& guess) {
    const Problem p(exchange, open, sticking);
    const std::size_t n = p.elements();
    Vector x = arrivals_at_bare(p);
    for (std::size_t k = 0; k < guess.size() && k < p.species(); ++k)
        for (std::size_t e = 0; e < n && guess[k].size() == n && open[k] > 0; ++e)
            x[k * n + e] = guess[k][e] / open[k];
    double scale = std::sqrt(double(p.species())) * norm(exchange.direct());
    scale = std::max(scale, 1e-300);

    CoupledArrivals result;
    const Vector none;
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
        Vector s;
        p.evaluate(b, state.x, s, nullptr);
        const Vector defect = p.defect(b, state.x, s);
        if (norm(defect) < flux_tolerance * scale) { // no ray and no ion of its own
            result.batch_flux[b] = result.flux;
            return;
        }
        Vector step, loss = state.loss;
        if (!p.newton_step(b, loss, defect, 1e-4, step)) {
            // Next to a change between two steady states: the answer at fixed sticking stands in.
            p.blend(s, 0, s, loss);
            RILLE_CHECK(p.newton_step(b, loss, defect, 1e-4, step), "transport of one batch");
        }
        Vector moved = state.x;
        for (std::size_t i = 0; i < moved.size(); ++i)
            moved[i] = std::max(moved[i] + step[i], 0.0);
        result.batch_flux[b] = by_species(p, moved);
    });
    return result;
}

} // namespace rille::fluxes
