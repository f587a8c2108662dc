// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: needs Eigen, which the library does not pass on.
#pragma once

#include <functional>
#include <vector>

namespace rille::fluxes {

/// y = M x for vectors of the operator's size; x and y do not overlap.
using LinearOperator = std::function<void(const double* x, double* y)>;

/// Solves M x = rhs by the stabilised biconjugate gradient method from the guess in `x` until
/// |M x - rhs| <= tolerance |rhs| and returns the number of iterations. Sums run in a fixed order.
/// Throws NumericsError if the residual is not reached.
/// Source: van der Vorst, SIAM J. Sci. Stat. Comput. 13, 631 (1992) [citation from memory].
int solve_linear(const LinearOperator&, const std::vector<double>& rhs, std::vector<double>& x,
                 double tolerance);

} // namespace rille::fluxes
