// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: the equations behind solve_coupled.
#pragma once

#include "fluxes/coupling.hpp"

#include <cmath>
#include <cstddef>
#include <memory>
#include <vector>

namespace rille::fluxes {

/// What the surface answers to arrivals x, in the units of the equations.
struct CoupledAnswer {
    std::vector<double> sticking;
    std::vector<double> emitted; ///< empty without by-products
    /// slope[(e * K + k) * K + l] = d(s_k x_k - emitted_k) / d(x_l) at element e, or, where species
    /// k has a first flight of its own, d(s_k x_k) / d(x_l) and, in `gain`, d(emitted_k) / d(x_l).
    std::vector<double> slope;
    std::vector<double> gain; ///< empty unless a species has a first flight of its own
};

/// x = source d + A ((1 - s) x + emitted) for every species, or T emitted in place of A emitted
/// where the first flight is not by the cosine law. In units of the open fluxes, or of the largest
/// emission of a by-product; species after species: x[k * n + e].
class CoupledEquations {
public:
    using Vector = std::vector<double>;
    CoupledEquations(const ExchangeOperator&, const std::vector<NeutralSupply>&, const AnswerOf&);

    std::size_t unknowns() const { return n_ * species_; }
    std::size_t species() const { return species_; }
    std::size_t elements() const { return n_; }
    bool by_products() const { return by_products_; }
    double unit(std::size_t k) const { return unit_[k]; } ///< [nm^-2 s^-1]
    /// Least arrival allowed. An exact exchange spreads what arrives by parabolas, which may pass
    /// below 0 where next to nothing arrives; other neutrals come from the open everywhere.
    double least() const { return by_products_ ? -HUGE_VAL : 0; }

    /// The answer at x; slopes if asked.
    CoupledAnswer answer(int batch, const Vector& x, bool slopes) const;
    /// Right side less left side.
    Vector defect(int batch, const Vector& x, const CoupledAnswer&) const;
    /// Makes `a` the answer (1 - share) before + share a.
    void blend(const CoupledAnswer& before, double share, CoupledAnswer& a) const;
    /// Slopes as if the answer did not change with the arrivals.
    void hold(CoupledAnswer&) const;

private:
    friend class NewtonStep;
    void set_units(const std::vector<NeutralSupply>&);
    void at_element(std::size_t e, int batch, const Vector& x, CoupledAnswer&) const;
    void transport(int batch, const Vector& leaving, const Vector& given_off, Vector& out) const;

    const ExchangeOperator& exchange_;
    const AnswerOf& answer_;
    std::vector<double> unit_, source_;      ///< per species; source: open flux in these units
    std::vector<const FirstFlight*> flight_; ///< per species, or null; empty if all are
    std::size_t n_, species_;
    bool by_products_ = false;
};

/// The linear equations of Newton's method at one answer: (I - A (I - slope) - T gain) step =
/// defect. Where all exchange goes through fewer places they are solved between those: with B to
/// the places, P from them and G = I - slope, step = defect + P m and m = B G (defect + P m). The
/// equations and the answer outlive it.
class NewtonStep {
public:
    NewtonStep(const CoupledEquations&, const CoupledAnswer&);
    ~NewtonStep();
    /// Whether it went well.
    bool solve(int batch, const std::vector<double>& defect, double tolerance,
               std::vector<double>& step) const;

private:
    class Places;
    bool solve_by_elements(int batch, const std::vector<double>& defect, double tolerance,
                           std::vector<double>& step) const;

    const CoupledEquations& equations_;
    const CoupledAnswer& answer_;
    std::unique_ptr<const Places> places_; ///< or null
};

} // namespace rille::fluxes
