// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: needs Eigen, which the library does not pass on.
#pragma once

#include <functional>
#include <vector>

namespace rille::fluxes {

/// y = M x for vectors of the operator's size; x and y do not overlap.
using LinearOperator = std::function<void(const double* x, double* y)>;

struct LinearSolution {
    int iterations = 0;
    bool converged = false;
};

/// Solves M x = rhs by the stabilised biconjugate gradient method from the guess in `x` until
/// |M x - rhs| <= 2 tolerance |rhs|. Sums run in a fixed order. If the residual is not reached, as
/// for a matrix next to a singular one, `converged` is false and `x` has no meaning.
/// `precondition`, if given, is about the inverse of M.
/// Source: van der Vorst, SIAM J. Sci. Stat. Comput. 13, 631 (1992) [citation from memory].
LinearSolution solve_linear(const LinearOperator&, const std::vector<double>& rhs,
                            std::vector<double>& x, double tolerance,
                            const LinearOperator& precondition = nullptr);

} // namespace rille::fluxes
