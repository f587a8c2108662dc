// SPDX-License-Identifier: Apache-2.0
#include "fluxes/coupled_equations.hpp"
#include "fluxes/krylov.hpp"

#include <Eigen/LU>
#include <tbb/parallel_for.h>

#include <algorithm>

namespace rille::fluxes {

/// The equations between places, (I - B G P) m = b for all species together, and their inverse
/// for each species by itself, which is near enough to the whole to precondition it.
class NewtonStep::Places {
public:
    Places(const CoupledEquations& equations, const CoupledAnswer& answer)
        : exchange_(equations.exchange_), slope_(answer.slope), elements_(equations.elements()),
          species_(equations.species()), places_(exchange_.places()) {
        std::vector<std::vector<double>> kept(species_ * species_);
        std::vector<const double*> used(species_ * species_, nullptr);
        for (std::size_t b = 0; b < kept.size(); ++b) {
            kept[b].resize(elements_);
            for (std::size_t e = 0; e < elements_; ++e)
                kept[b][e] = share_kept(e, b / species_, b % species_);
            const auto any = [](double share) { return share != 0; };
            if (std::any_of(kept[b].begin(), kept[b].end(), any)) used[b] = kept[b].data();
            used_.push_back(used[b] != nullptr);
        }
        matrix_.assign(used.size() * places_ * places_, 0.0);
        exchange_.between_places(used, matrix_.data());
        inverse_.resize(species_);
        tbb::parallel_for(std::size_t(0), species_, [&](std::size_t k) {
            const auto n = static_cast<Eigen::Index>(places_);
            inverse_[k].compute(RowMatrix::Identity(n, n) - block(k, k));
        });
    }

    bool solve(const std::vector<double>& defect, double tolerance,
               std::vector<double>& step) const {
        std::vector<double> rhs = to_places(defect), mean(rhs.size());
        if (std::all_of(rhs.begin(), rhs.end(), [](double value) { return value == 0; })) {
            step = defect;
            return true;
        }
        precondition(rhs.data(), mean.data());
        const auto matrix = [this](const double* in, double* out) { apply(in, out); };
        const auto inverse = [this](const double* in, double* out) { precondition(in, out); };
        if (!solve_linear(matrix, rhs, mean, tolerance, inverse).converged) return false;
        step.resize(defect.size());
        for (std::size_t k = 0; k < species_; ++k)
            exchange_.from_places(mean.data() + k * places_, step.data() + k * elements_);
        for (std::size_t i = 0; i < step.size(); ++i)
            step[i] += defect[i];
        return true;
    }

private:
    using RowMatrix = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;

    double share_kept(std::size_t e, std::size_t k, std::size_t l) const {
        return (k == l ? 1.0 : 0.0) - slope_[(e * species_ + k) * species_ + l];
    }
    Eigen::Map<const RowMatrix> block(std::size_t k, std::size_t l) const {
        const auto n = static_cast<Eigen::Index>(places_);
        return {matrix_.data() + (k * species_ + l) * places_ * places_, n, n};
    }
    std::vector<double> to_places(const std::vector<double>& x) const {
        std::vector<double> mean(species_ * places_), given(elements_);
        for (std::size_t k = 0; k < species_; ++k) {
            for (std::size_t e = 0; e < elements_; ++e) {
                given[e] = 0;
                for (std::size_t l = 0; l < species_; ++l)
                    given[e] += share_kept(e, k, l) * x[l * elements_ + e];
            }
            exchange_.to_places(given.data(), mean.data() + k * places_);
        }
        return mean;
    }
    void apply(const double* in, double* out) const {
        const auto n = static_cast<Eigen::Index>(places_);
        for (std::size_t k = 0; k < species_; ++k) {
            Eigen::Map<Eigen::VectorXd> to(out + k * places_, n);
            to = Eigen::Map<const Eigen::VectorXd>(in + k * places_, n);
            for (std::size_t l = 0; l < species_; ++l)
                if (used_[k * species_ + l])
                    to.noalias() -=
                        block(k, l) * Eigen::Map<const Eigen::VectorXd>(in + l * places_, n);
        }
    }
    void precondition(const double* in, double* out) const {
        const auto n = static_cast<Eigen::Index>(places_);
        for (std::size_t k = 0; k < species_; ++k)
            Eigen::Map<Eigen::VectorXd>(out + k * places_, n) =
                inverse_[k].solve(Eigen::Map<const Eigen::VectorXd>(in + k * places_, n));
    }

    const ExchangeOperator& exchange_;
    const std::vector<double>& slope_;
    std::size_t elements_, species_, places_;
    std::vector<char> used_;                              ///< per block k * species + l
    std::vector<double> matrix_;                          ///< block after block: B G P
    std::vector<Eigen::PartialPivLU<RowMatrix>> inverse_; ///< per species
};

NewtonStep::NewtonStep(const CoupledEquations& equations, const CoupledAnswer& answer)
    : equations_(equations), answer_(answer) {
    if (equations.exchange_.places() > 0 && answer.gain.empty())
        places_ = std::make_unique<const Places>(equations, answer);
}

NewtonStep::~NewtonStep() = default;

bool NewtonStep::solve(int batch, const std::vector<double>& defect, double tolerance,
                       std::vector<double>& step) const {
    return places_ ? places_->solve(defect, tolerance, step)
                   : solve_by_elements(batch, defect, tolerance, step);
}

bool NewtonStep::solve_by_elements(int batch, const std::vector<double>& defect, double tolerance,
                                   std::vector<double>& step) const {
    const std::size_t n = equations_.elements(), K = equations_.species();
    const CoupledAnswer& a = answer_;
    step = defect;
    std::vector<double> leaving(n * K), arrived(n * K), given_off(a.gain.empty() ? 0 : n * K);
    const auto matrix = [&](const double* in, double* out) {
        for (std::size_t e = 0; e < n; ++e)
            for (std::size_t k = 0; k < K; ++k) {
                const std::size_t row = (e * K + k) * K;
                double value = in[k * n + e];
                for (std::size_t l = 0; l < K; ++l)
                    value -= a.slope[row + l] * in[l * n + e];
                leaving[k * n + e] = value;
                if (given_off.empty()) continue;
                given_off[k * n + e] = 0;
                for (std::size_t l = 0; l < K; ++l)
                    given_off[k * n + e] += a.gain[row + l] * in[l * n + e];
            }
        equations_.transport(batch, leaving, given_off, arrived);
        for (std::size_t i = 0; i < arrived.size(); ++i)
            out[i] = in[i] - arrived[i];
    };
    return solve_linear(matrix, defect, step, tolerance).converged;
}

} // namespace rille::fluxes
