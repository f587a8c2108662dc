// SPDX-License-Identifier: Apache-2.0
#include "fluxes/krylov.hpp"

#include "geometry/check.hpp"

#include <Eigen/IterativeLinearSolvers>
#include <Eigen/SparseCore>

namespace rille::fluxes {
namespace {

/// What Eigen's iterative solvers ask of a matrix that exists only as a product.
class Product;

/// What they ask of a preconditioner: one that is given, or none.
class Precondition {
public:
    template <typename Matrix>
    Precondition& analyzePattern(const Matrix&) {
        return *this;
    }
    template <typename Matrix>
    Precondition& factorize(const Matrix&) {
        return *this;
    }
    template <typename Matrix>
    Precondition& compute(const Matrix&) {
        return *this;
    }
    Eigen::ComputationInfo info() { return Eigen::Success; }
    void use(const LinearOperator& apply) { apply_ = apply ? &apply : nullptr; }
    template <typename Rhs>
    Eigen::VectorXd solve(const Eigen::MatrixBase<Rhs>& given) const {
        const Eigen::VectorXd b = given;
        if (!apply_) return b;
        Eigen::VectorXd x(b.size());
        (*apply_)(b.data(), x.data());
        return x;
    }

private:
    const LinearOperator* apply_ = nullptr;
};

} // namespace
} // namespace rille::fluxes

namespace Eigen::internal {
template <>
struct traits<rille::fluxes::Product> : traits<SparseMatrix<double>> {};
} // namespace Eigen::internal

namespace rille::fluxes {
namespace {

class Product : public Eigen::EigenBase<Product> {
public:
    using Scalar = double;
    using RealScalar = double;
    using StorageIndex = int;
    enum {
        ColsAtCompileTime = Eigen::Dynamic,
        MaxColsAtCompileTime = Eigen::Dynamic,
        IsRowMajor = false
    };

    Product(const LinearOperator& apply, Eigen::Index size) : apply_(apply), size_(size) {}
    Eigen::Index rows() const { return size_; }
    Eigen::Index cols() const { return size_; }
    const LinearOperator& apply() const { return apply_; }

    template <typename Rhs>
    Eigen::Product<Product, Rhs, Eigen::AliasFreeProduct>
    operator*(const Eigen::MatrixBase<Rhs>& x) const {
        return {*this, x.derived()};
    }

private:
    const LinearOperator& apply_;
    Eigen::Index size_;
};

} // namespace
} // namespace rille::fluxes

namespace Eigen::internal {
template <typename Rhs>
struct generic_product_impl<rille::fluxes::Product, Rhs, SparseShape, DenseShape, GemvProduct>
    : generic_product_impl_base<rille::fluxes::Product, Rhs,
                                generic_product_impl<rille::fluxes::Product, Rhs>> {
    template <typename Dest>
    static void scaleAndAddTo(Dest& dest, const rille::fluxes::Product& m, const Rhs& rhs,
                              const double& alpha) {
        const VectorXd x = rhs;
        VectorXd y(x.size());
        m.apply()(x.data(), y.data());
        dest.noalias() += alpha * y;
    }
};
} // namespace Eigen::internal

namespace rille::fluxes {

LinearSolution solve_linear(const LinearOperator& apply, const std::vector<double>& rhs,
                            std::vector<double>& x, double tolerance,
                            const LinearOperator& precondition) {
    const auto n = static_cast<Eigen::Index>(rhs.size());
    const Product matrix(apply, n);
    Eigen::BiCGSTAB<Product, Precondition> solver(matrix);
    solver.preconditioner().use(precondition);
    solver.setTolerance(tolerance);
    solver.setMaxIterations(2000);
    const Eigen::Map<const Eigen::VectorXd> b(rhs.data(), n);
    Eigen::Map<Eigen::VectorXd> solution(x.data(), n);
    int iterations = 0;
    double before = HUGE_VAL;
    // The recursive residual drifts from the true one: start again from what is reached.
    for (int attempt = 0; attempt < 5; ++attempt) {
        solution = solver.solveWithGuess(b, solution.eval()).eval();
        iterations += static_cast<int>(solver.iterations());
        Eigen::VectorXd residual(n);
        apply(x.data(), residual.data());
        residual -= b;
        if (residual.norm() <= 2 * tolerance * b.norm()) return {iterations, true};
        if (!(residual.norm() < 0.5 * before)) break;
        before = residual.norm();
    }
    return {iterations, false};
}

} // namespace rille::fluxes
