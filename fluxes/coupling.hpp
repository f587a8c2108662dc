// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/exchange_operator.hpp"
#include "fluxes/mechanism.hpp"

#include <array>
#include <functional>
#include <vector>

namespace rille::fluxes {

/// How a surface answers neutrals at one element.
struct NeutralAnswer {
    std::array<double, max_species> sticking{}; ///< probabilities
    std::array<double, max_species> emitted{};  ///< by-products given off [nm^-2 s^-1]
};
/// The answer given the impinging fluxes of all neutrals [nm^-2 s^-1]. batch = -1: with the ions of
/// all batches, 0..7: with those of one.
using AnswerOf = std::function<NeutralAnswer(int element, int batch, const double* neutrals)>;

class FirstFlight;

/// Where a neutral species comes from.
struct NeutralSupply {
    double open = 0;                           ///< flux in the open [nm^-2 s^-1]
    bool given_off = false;                    ///< the surface gives it off as well
    const FirstFlight* first_flight = nullptr; ///< of what it gives off; null: by the cosine law
};

/// Impinging neutrals and the surface's answer to them, solved together.
struct CoupledArrivals {
    std::vector<std::vector<double>> flux; ///< [species][element] [nm^-2 s^-1]
    /// batch_flux[b][species][element]: had only the rays (and ions) of batch b been used; one
    /// Newton step from `flux`.
    std::vector<std::vector<std::vector<double>>> batch_flux;
    int iterations = 0;
    double residual = 0;  ///< largest change of a sticking in the last iteration, or distance from
                          ///< what the kinetics answers if `relaxed`
    bool relaxed = false; ///< whether Newton's method alone did not get there
};

/// Solves arrival_k = open_k d + A ((1 - s_k(arrivals)) arrival_k + emitted_k(arrivals)) for all
/// species k together, to 1e-6 in every sticking probability and 1e-8 in the arrivals (relative
/// residual, at a sticking within 1e-6 of what the kinetics answers: a kink of the kinetics passes,
/// too); with by-products to 1e-11 in the arrivals.
///
/// Where a film takes up more of its neutral than the bare surface does, elements starve each other
/// and several steady states can exist. The one taken is the one next to the start: Newton's method
/// with backtracking from the previous arrivals `guess` ([species][element]; empty: the arrivals at
/// a surface that nothing has reached yet), and, where that does not converge, the state in which
/// the sticking of the start comes to rest when it relaxes in time towards what the kinetics
/// answers.
/// Throws NumericsError if the relaxation does not come to rest.
CoupledArrivals solve_coupled(const ExchangeOperator&, const std::vector<NeutralSupply>&,
                              const AnswerOf&, const std::vector<std::vector<double>>& guess);

} // namespace rille::fluxes
