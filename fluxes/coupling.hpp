// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/exchange.hpp"
#include "fluxes/mechanism.hpp"

#include <array>
#include <functional>
#include <vector>

namespace rille::fluxes {

/// Sticking probability of every neutral at one element, given the impinging fluxes of all of them
/// [nm^-2 s^-1]. batch = -1: with the ions of all batches, 0..7: with those of one.
using StickingOf =
    std::function<std::array<double, max_species>(int element, int batch, const double* neutrals)>;

/// Impinging neutrals and the surface's answer to them, solved together.
struct CoupledArrivals {
    std::vector<std::vector<double>> flux; ///< [species][element] [nm^-2 s^-1]
    /// batch_flux[b][species][element]: had only the rays (and ions) of batch b been used; one
    /// Newton step from `flux`.
    std::vector<std::vector<std::vector<double>>> batch_flux;
    int iterations = 0;
    double residual = 0; ///< largest change of a sticking probability in the last iteration
};

/// Solves arrival_k = open_k d + A (1 - s_k(arrivals)) arrival_k for all species k together by
/// Newton's method with backtracking, the sticking linearised at every element in all species,
/// until every sticking probability changes by less than 1e-6 and the relative residual is below
/// 1e-8. `open`: flux of every species in the open. `guess` ([species][element]) may be empty.
/// Throws NumericsError if it does not converge.
CoupledArrivals solve_coupled(const Exchange&, const std::vector<double>& open,
                              const StickingOf& sticking,
                              const std::vector<std::vector<double>>& guess);

} // namespace rille::fluxes
