// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exact_exchange.hpp"

#include "fluxes/open_sky.hpp"
#include "fluxes/ring_factors.hpp"
#include "geometry/check.hpp"

#include <Eigen/Core>
#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

using RowMatrix =
    Eigen::Map<const Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>>;
using Matrix = Eigen::Map<const Eigen::MatrixXd>;

} // namespace

bool ExactExchange::serves(const geometry::Domain& domain, const geometry::Surface& surface) {
    if (domain.extruded()) return !OpenSky(domain, surface).floating_pieces();
    return RoundProfile::serves(domain, surface);
}

ExactExchange::ExactExchange(const geometry::Domain& domain, const geometry::Surface& surface,
                             const geometry::RayCaster& caster, const std::vector<int>& material,
                             const PatchSizes& sizes) {
    direct_.assign(surface.size(), 0.0);
    const auto cut = [&](std::vector<int> order, const std::vector<int>& ends) {
        patches_ =
            std::make_shared<Patches>(surface, caster, std::move(order), material, ends, sizes);
    };
    const auto find_direct = [&](const auto& sky) {
        tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(size()), 32),
                          [&](const tbb::blocked_range<int>& range) {
                              for (int e = range.begin(); e != range.end(); ++e)
                                  if (patches_->patch_of(e) >= 0)
                                      direct_[e] = std::clamp(sky(e), 0.0, 1.0);
                          });
    };
    if (domain.extruded()) {
        std::vector<int> order;
        const std::vector<int> ends = string_ends(domain, surface, order);
        cut(std::move(order), ends);
        const OpenSky sky(domain, surface);
        find_direct([&](int e) { return sky.cosine_flux(e); });
        exchange_ = string_factors(domain, surface, *patches_).exchange;
    } else {
        const RoundProfile profile(domain, surface);
        cut(profile.order(), {profile.rim()});
        find_direct([&](int e) { return profile.sky(patches_->place_of(e)); });
        exchange_ = profile.factors(*patches_);
    }
    std::vector<double> view(size());
    for (std::size_t e = 0; e < size(); ++e)
        view[e] = 1 - direct_[e];
    patches_->set_view(surface, std::move(view));
    close();
    constexpr double bearable = 0.05;
    if (!(closure_defect_ < bearable))
        throw NumericsError("what leaves a patch does not arrive: the surface is no profile that "
                            "exact factors can treat");
}

/// Factors between patches, how well everything adds up, and what is missing laid on the diagonal:
/// then zero sticking gives flux 1, and nothing is lost.
void ExactExchange::close() {
    const Patches& p = *patches_;
    const std::size_t n = p.size(), columns = p.order().size();
    mouth_.resize(n);
    p.average(direct_.data(), mouth_.data());
    coarse_.assign(n * n, 0.0);
    escape_.assign(size(), 0.0);
    for (std::size_t i = 0; i < n; ++i) {
        mouth_[i] *= p.area(i);
        double* row = &exchange_[i * columns];
        double missing = p.area(i) - mouth_[i];
        for (std::size_t k = 0; k < columns; ++k)
            missing -= row[k];
        closure_defect_ = std::max(closure_defect_, std::fabs(missing) / p.area(i));
        for (int k = p.first(i); k < p.first(i + 1); ++k)
            row[k] += missing * p.element_area(p.order()[k]) / p.area(i);
        for (std::size_t j = 0; j < n; ++j)
            for (int k = p.first(j); k < p.first(j + 1); ++k) {
                coarse_[i * n + j] += row[k];
                escape_[p.order()[k]] += row[k];
            }
    }
    for (const int e : p.order())
        escape_[e] = 1 - escape_[e] / p.element_area(e);
    for (std::size_t i = 0; i < n; ++i)
        for (std::size_t j = 0; j < i; ++j) {
            double &a = coarse_[i * n + j], &b = coarse_[j * n + i];
            asymmetry_ = std::max(asymmetry_, std::fabs(a - b) / std::min(p.area(i), p.area(j)));
            a = b = 0.5 * (a + b);
        }
}

/// Mean arrivals at the patches from an emission of the elements.
void ExactExchange::gather(const double* emitted, double* mean) const {
    const auto n = static_cast<Eigen::Index>(patches_->size());
    const auto columns = static_cast<Eigen::Index>(patches_->order().size());
    Eigen::VectorXd in(columns);
    for (Eigen::Index k = 0; k < columns; ++k)
        in[k] = emitted[patches_->order()[k]];
    Eigen::Map<Eigen::VectorXd> out(mean, n);
    out.noalias() = RowMatrix(exchange_.data(), n, columns) * in;
    for (Eigen::Index p = 0; p < n; ++p)
        mean[p] /= patches_->area(p);
}

void ExactExchange::apply(int, const double* emitted, double* arrival) const {
    std::vector<double> mean(patches_->size());
    gather(emitted, mean.data());
    from_places(mean.data(), arrival);
}

void ExactExchange::from_places(const double* mean, double* arrival) const {
    std::fill(arrival, arrival + size(), 0.0);
    patches_->spread(mean, arrival);
}

void ExactExchange::between_places(const std::vector<const double*>& kept, double* matrix) const {
    const std::size_t n = patches_->size(), columns = patches_->order().size();
    tbb::parallel_for(std::size_t(0), n, [&](std::size_t i) {
        std::vector<double> row(columns);
        for (std::size_t b = 0; b < kept.size(); ++b) {
            if (!kept[b]) continue;
            for (std::size_t k = 0; k < columns; ++k)
                row[k] =
                    exchange_[i * columns + k] / patches_->area(i) * kept[b][patches_->order()[k]];
            patches_->project(row.data(), matrix + (b * n + i) * n);
        }
    });
}

/// Solves (1 - F t) change = defect between patches that give back the share t of what arrives.
/// In B = t change the matrix a / t - a F is symmetric and positive definite: conjugate gradients
/// with its diagonal as preconditioner. Patches with t = 0 emit nothing and are left out.
int ExactExchange::correct(const std::vector<double>& emits, const std::vector<double>& defect,
                           std::vector<double>& change) const {
    constexpr double tolerance = 1e-4; // of a correction
    constexpr int most = 5000;
    const auto n = static_cast<Eigen::Index>(patches_->size());
    const Matrix exchange(coarse_.data(), n, n);
    Eigen::VectorXd inverse(n), weight(n), rhs(n), x = Eigen::VectorXd::Zero(n), image(n);
    for (Eigen::Index p = 0; p < n; ++p) {
        weight[p] = emits[p] > 0 ? patches_->area(p) / emits[p] : 0.0;
        const double diagonal = weight[p] - exchange(p, p);
        inverse[p] = emits[p] > 0 && diagonal > 0 ? 1 / diagonal : 0.0;
        rhs[p] = inverse[p] > 0 ? patches_->area(p) * defect[p] : 0.0;
    }
    Eigen::VectorXd residual = rhs, ahead = inverse.cwiseProduct(residual), step = ahead;
    double rho = residual.dot(ahead);
    const double goal = tolerance * tolerance * rho;
    int count = 0;
    for (; rho > goal && count < most; ++count) {
        image.noalias() = exchange * step;
        for (Eigen::Index p = 0; p < n; ++p)
            image[p] = inverse[p] > 0 ? weight[p] * step[p] - image[p] : 0.0;
        const double length = rho / step.dot(image);
        x += length * step;
        residual -= length * image;
        ahead = inverse.cwiseProduct(residual);
        const double next = residual.dot(ahead);
        step = ahead + (next / rho) * step;
        rho = next;
    }
    if (!(rho <= goal)) throw NumericsError("the neutral transport equations did not converge");
    image.noalias() = exchange * x;
    for (Eigen::Index p = 0; p < n; ++p)
        change[p] = defect[p] + image[p] / patches_->area(p);
    return count;
}

/// Corrects by the factors between patches what the factors from elements leave as a defect.
std::vector<double> ExactExchange::solve(const std::vector<double>& sticking,
                                         const std::vector<double>& guess, int* iterations) const {
    RILLE_CHECK(sticking.size() == size(), "one sticking per element");
    const std::size_t n = patches_->size();
    std::vector<double> x = guess.size() == size() ? guess : std::vector<double>(size(), 1.0);
    std::vector<double> given(size()), emits(n), mean(n), now(n), change(n);
    for (std::size_t e = 0; e < size(); ++e)
        given[e] = 1 - sticking[e];
    patches_->average(given.data(), emits.data());
    for (std::size_t e = 0; e < size(); ++e)
        given[e] = x[e] - direct_[e];
    patches_->average(given.data(), mean.data());
    constexpr int most_rounds = 100;
    double before = HUGE_VAL;
    for (int round = 0;; ++round) {
        x = direct_;
        patches_->spread(mean.data(), x.data());
        for (std::size_t e = 0; e < size(); ++e)
            given[e] = (1 - sticking[e]) * x[e];
        gather(given.data(), now.data());
        double size_of_defect = 0, size_of_all = 0;
        for (std::size_t p = 0; p < n; ++p) {
            now[p] -= mean[p];
            size_of_defect += patches_->area(p) * now[p] * now[p];
            size_of_all += mouth_[p] * mouth_[p] / patches_->area(p);
        }
        if (size_of_defect <= 1e-20 * size_of_all) break;
        if (round == most_rounds || !(size_of_defect < before))
            throw NumericsError("the neutral transport equations did not converge");
        before = size_of_defect;
        const int count = correct(emits, now, change);
        if (iterations) *iterations += count;
        for (std::size_t p = 0; p < n; ++p)
            mean[p] += change[p];
    }
    for (double& value : x)
        value = std::max(value, 0.0);
    return x;
}

} // namespace rille::fluxes
