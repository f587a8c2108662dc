// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupled_equations.hpp"

#include "fluxes/first_flight.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>

namespace rille::fluxes {

CoupledEquations::CoupledEquations(const ExchangeOperator& exchange,
                                   const std::vector<NeutralSupply>& supply, const AnswerOf& answer)
    : exchange_(exchange), answer_(answer), n_(exchange.size()), species_(supply.size()) {
    for (const NeutralSupply& s : supply) {
        unit_.push_back(s.open);
        source_.push_back(1);
        by_products_ = by_products_ || s.given_off;
    }
    if (by_products_) set_units(supply);
    const auto own = [](const NeutralSupply& s) { return s.first_flight != nullptr; };
    if (std::any_of(supply.begin(), supply.end(), own))
        for (const NeutralSupply& s : supply)
            flight_.push_back(s.first_flight);
}

/// By-products are measured by their largest emission where none of them or of the other neutrals
/// arrives, or the others as in the open.
void CoupledEquations::set_units(const std::vector<NeutralSupply>& supply) {
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

void CoupledEquations::at_element(std::size_t e, int batch, const Vector& x,
                                  CoupledAnswer& a) const {
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
            const std::size_t at_kl = (e * species_ + k) * species_ + l;
            const double xk = x[k * n_ + e];
            const double bend = (there.sticking[k] - here.sticking[k]) / (more - at) * xk;
            a.slope[at_kl] = bend + (k == l ? there.sticking[k] : 0.0);
            if (!by_products_) continue;
            const double gain = (there.emitted[k] - here.emitted[k]) / (unit_[k] * (more - at));
            if (!flight_.empty() && flight_[k])
                a.gain[at_kl] = gain;
            else
                a.slope[at_kl] -= gain;
        }
    }
}

CoupledAnswer CoupledEquations::answer(int batch, const Vector& x, bool slopes) const {
    CoupledAnswer a;
    a.sticking.resize(unknowns());
    if (by_products_) a.emitted.resize(unknowns());
    if (slopes) a.slope.resize(unknowns() * species_);
    if (slopes && !flight_.empty()) a.gain.resize(unknowns() * species_);
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n_, 64), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e)
            at_element(e, batch, x, a);
    });
    return a;
}

/// out_k = A leaving_k, and T given_off_k more where species k has a first flight of its own.
void CoupledEquations::transport(int batch, const Vector& leaving, const Vector& given_off,
                                 Vector& out) const {
    for (std::size_t k = 0; k < species_; ++k)
        exchange_.apply(batch, leaving.data() + k * n_, out.data() + k * n_);
    Vector landed(flight_.empty() ? 0 : n_);
    for (std::size_t k = 0; k < flight_.size(); ++k) {
        if (!flight_[k]) continue;
        flight_[k]->apply(batch, given_off.data() + k * n_, landed.data());
        for (std::size_t e = 0; e < n_; ++e)
            out[k * n_ + e] += landed[e];
    }
}

CoupledEquations::Vector CoupledEquations::defect(int batch, const Vector& x,
                                                  const CoupledAnswer& a) const {
    Vector leaving(unknowns()), out(unknowns());
    for (std::size_t i = 0; i < x.size(); ++i)
        leaving[i] = (1 - a.sticking[i]) * x[i];
    for (std::size_t i = 0; i < a.emitted.size(); ++i)
        if (flight_.empty() || !flight_[i / n_]) leaving[i] += a.emitted[i];
    transport(batch, leaving, a.emitted, out);
    const auto& direct = exchange_.direct(batch);
    for (std::size_t i = 0; i < x.size(); ++i)
        out[i] += source_[i / n_] * direct[i % n_] - x[i];
    return out;
}

void CoupledEquations::blend(const CoupledAnswer& before, double share, CoupledAnswer& a) const {
    for (double& part : a.slope)
        part *= share;
    for (double& part : a.gain)
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

void CoupledEquations::hold(CoupledAnswer& a) const {
    const CoupledAnswer fixed = a;
    a.slope.assign(unknowns() * species_, 0.0);
    if (!flight_.empty()) a.gain.assign(unknowns() * species_, 0.0);
    blend(fixed, 0, a);
}

} // namespace rille::fluxes
