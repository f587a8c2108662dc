// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

// What the points of a study say about each axis: main effects, first-order sensitivity, and fits
// of the response where they hold. Works on plain columns, whatever they were read from.

/// A column that was varied on its own (not one that follows another).
struct EffectAxis {
    std::string label, unit;
    std::vector<double> values;     ///< one a row; of words the index into `words`
    std::vector<std::string> words; ///< empty: numbers
};

/// Rows of one response; only points that have a value.
struct EffectData {
    std::string response, unit;
    std::vector<EffectAxis> axes;
    std::vector<double> y;
    std::vector<double> error; ///< 95 % sampling error of y, one a row; 0 = not known or exact
    std::size_t left_out = 0;  ///< points without a value (failed, censored, missing)
};

/// Mean response where an axis has one value, or lies between two.
struct EffectLevel {
    double from = 0, to = 0; ///< the same for a single value
    std::string word;        ///< of an axis of words
    double mean = 0;
    double error = 0; ///< 95 %, of the mean over what the other axes do
    std::size_t count = 0;
};

struct AxisEffect {
    std::string label, unit;
    std::vector<EffectLevel> levels;
    double span = 0; ///< largest less smallest mean
    /// First-order sensitivity (Sobol index): share of the variance of the response that the axis
    /// explains on its own; with a 95 % interval. Empty where it cannot be said: `note` says why.
    std::optional<double> first_order;
    double low = 0, high = 0;
    std::string note;
};

struct Effects {
    std::string response, unit;
    std::size_t points = 0, left_out = 0;
    double mean = 0, deviation = 0; ///< of the response over all points
    bool is_full_grid = false;      ///< every combination is there, equally often
    std::string method;             ///< how the indices and their intervals were found
    std::vector<AxisEffect> axes;
    /// Share of the variance that no axis explains on its own: interactions, and noise.
    std::optional<double> together;
};

/// Main effects and sensitivities. On a full grid the means over levels are exact and their spread
/// is corrected for the noise of the points, whose size the interval follows (2000 draws of it).
/// Elsewhere axes are divided into parts with equally many points, the spread between parts is
/// corrected for that within (analysis of variance), and the interval is a bootstrap over points
/// (McKay 1995; Efron and Tibshirani 1993). Deterministic in `seed`.
Effects effects_of(const EffectData&, std::uint64_t seed = 1);

/// A curve through one line of the answer.
struct ResponseFit {
    std::string line;   ///< "cd 30 nm"; empty with one line
    std::string model;  ///< "linear", "quadratic" or "none"
    std::string reason; ///< why this one, or why none: points, chi-squared, probability
    /// y = c0 + c1 x + c2 x^2 for x in the unit of the axis, with 95 % errors.
    std::vector<double> coefficients, errors;
    double chi_squared = 0, probability = 0; ///< of the lack of fit of the model
    int degrees_of_freedom = 0;
    double x_low = 0, x_high = 0; ///< where it holds; never beyond
    double largest_residual = 0;
};

/// Least squares weighted by the errors. A model stands if there are two more places along x than
/// it has coefficients and if its lack of fit is no larger than errors (or repeats at the same x)
/// explain, at 5 %. The straight line is tried first; a parabola must also bend by more than its
/// own error.
ResponseFit fit_response(const std::string& line, const std::vector<double>& x,
                         const std::vector<double>& y, const std::vector<double>& error);

} // namespace rille::engine
