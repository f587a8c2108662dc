// SPDX-License-Identifier: Apache-2.0
#include "engine/study/effects.hpp"

#include <Eigen/Dense>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

namespace rille::engine {

namespace {

constexpr double student_seven = 2.364624; // 97.5 %, 7 degrees of freedom: eight batches
constexpr double normal_95 = 1.959964;
constexpr double level = 0.05;

/// How large the scatter of y is without any model.
struct Scatter {
    std::vector<double> deviation; ///< of each point; relative ones where only repeats tell
    bool is_known = false;         ///< deviations are absolute
    double pure_squares = 0;       ///< of repeats about their means
    int pure_freedom = 0;
    int places = 0; ///< different x
};

Scatter scatter_of(const std::vector<double>& x, const std::vector<double>& y,
                   const std::vector<double>& error) {
    Scatter s;
    std::map<double, std::vector<double>> at;
    for (std::size_t i = 0; i < x.size(); ++i)
        at[x[i]].push_back(y[i]);
    s.places = static_cast<int>(at.size());
    for (const auto& [place, values] : at) {
        double mean = 0;
        for (const double value : values)
            mean += value / static_cast<double>(values.size());
        for (const double value : values)
            s.pure_squares += (value - mean) * (value - mean);
        s.pure_freedom += static_cast<int>(values.size()) - 1;
    }
    s.is_known = s.pure_freedom < 3 &&
                 std::all_of(error.begin(), error.end(), [](double e) { return e > 0; });
    for (std::size_t i = 0; i < x.size(); ++i)
        s.deviation.push_back(s.is_known ? error[i] / student_seven : 1.0);
    return s;
}

struct Polynomial {
    Eigen::VectorXd coefficients;
    Eigen::MatrixXd covariance;
    double squares = 0; ///< weighted, of the residuals
    double largest = 0; ///< residual, in the unit of y
};

/// Weighted least squares in x / `scale`, which keeps the powers of one size.
Polynomial solve(int degree, double scale, const std::vector<double>& x,
                 const std::vector<double>& y, const Scatter& scatter) {
    const auto n = static_cast<Eigen::Index>(x.size());
    Eigen::MatrixXd a(n, degree + 1);
    Eigen::VectorXd b(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const double weight = 1 / scatter.deviation[i];
        for (int k = 0; k <= degree; ++k)
            a(i, k) = weight * std::pow(x[i] / scale, k);
        b(i) = weight * y[i];
    }
    Polynomial p;
    p.coefficients = a.colPivHouseholderQr().solve(b);
    p.covariance = (a.transpose() * a).inverse();
    const Eigen::VectorXd residual = a * p.coefficients - b;
    p.squares = residual.squaredNorm();
    for (Eigen::Index i = 0; i < n; ++i)
        p.largest = std::max(p.largest, std::abs(residual(i)) * scatter.deviation[i]);
    for (int k = 0; k <= degree; ++k) {
        const double power = std::pow(scale, k);
        p.coefficients(k) /= power;
        for (int j = 0; j <= degree; ++j)
            p.covariance(k, j) /= power * std::pow(scale, j);
    }
    return p;
}

/// Probability that the model, if true, misses by as much: chi-squared where errors are known, F
/// of the lack of fit against repeats elsewhere.
void judge(const Polynomial& p, const Scatter& s, std::size_t points, ResponseFit& fit) {
    const int used = static_cast<int>(p.coefficients.size());
    double variance = 1;
    if (s.is_known) {
        fit.degrees_of_freedom = static_cast<int>(points) - used;
        fit.chi_squared = p.squares;
        const boost::math::chi_squared law(fit.degrees_of_freedom);
        fit.probability = boost::math::cdf(boost::math::complement(law, fit.chi_squared));
    } else {
        fit.degrees_of_freedom = s.places - used;
        variance = s.pure_squares / s.pure_freedom;
        const double lack = std::max(0.0, p.squares - s.pure_squares);
        fit.chi_squared = variance > 0 ? lack / variance : lack > 0 ? INFINITY : 0;
        const boost::math::fisher_f law(fit.degrees_of_freedom, s.pure_freedom);
        fit.probability = std::isinf(fit.chi_squared)
                              ? 0
                              : boost::math::cdf(boost::math::complement(
                                    law, fit.chi_squared / fit.degrees_of_freedom));
    }
    fit.largest_residual = p.largest;
    fit.coefficients.assign(p.coefficients.data(), p.coefficients.data() + used);
    fit.errors.clear();
    for (int k = 0; k < used; ++k)
        fit.errors.push_back(normal_95 * std::sqrt(variance * p.covariance(k, k)));
}

} // namespace

ResponseFit fit_response(const std::string& line, const std::vector<double>& x,
                         const std::vector<double>& y, const std::vector<double>& error) {
    ResponseFit none;
    none.line = line;
    none.model = "none";
    const Scatter scatter = scatter_of(x, y, error);
    if (scatter.places < 4) {
        none.reason =
            fmt::format("{} places along x are too few; a straight line needs 4", scatter.places);
        return none;
    }
    if (!scatter.is_known && scatter.pure_freedom < 3) {
        none.reason = "neither errors nor repeats say how far the points may lie off a curve";
        return none;
    }
    const auto [low, high] = std::minmax_element(x.begin(), x.end());
    none.x_low = *low;
    none.x_high = *high;
    const double scale = std::max(std::abs(*low), std::abs(*high));
    for (const int degree : {1, 2}) {
        if (scatter.places < degree + 3) break;
        ResponseFit fit = none;
        fit.model = degree == 1 ? "linear" : "quadratic";
        judge(solve(degree, scale, x, y, scatter), scatter, x.size(), fit);
        const bool bends = degree == 1 || std::abs(fit.coefficients[2]) > fit.errors[2];
        fit.reason = fmt::format("lack of fit: chi-squared {:.3g} for {} degrees of freedom, "
                                 "probability {:.2g}; largest residual {:.3g}",
                                 fit.chi_squared, fit.degrees_of_freedom, fit.probability,
                                 fit.largest_residual);
        if (fit.probability >= level && bends) return fit;
        if (!none.reason.empty()) none.reason += "; ";
        none.reason += fmt::format("{}: {}", fit.model, fit.reason);
    }
    none.reason = "the points leave the curves by more than their errors (" + none.reason + ")";
    return none;
}

} // namespace rille::engine
