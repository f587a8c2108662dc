// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_parts.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

/// The smallest of 1, 2, 5 x 10^n that is not below `value`.
double round_step(double value) {
    const double power = std::pow(10.0, std::floor(std::log10(value) + 1e-9));
    for (const double step : {1.0, 2.0, 5.0})
        if (value <= step * power * (1 + 1e-9)) return step * power;
    return 10 * power;
}

double step_for(double low, double high, std::size_t most) {
    double step = round_step((high - low) / static_cast<double>(std::max<std::size_t>(most, 1)));
    const auto count = [&](double s) {
        return std::floor(high / s + 1e-9) - std::ceil(low / s - 1e-9) + 1;
    };
    while (count(step) > static_cast<double>(most))
        step = round_step(1.5 * step);
    return step;
}

std::string power_of_ten(int power) {
    static const char* digits[] = {"⁰", "¹", "²", "³", "⁴", "⁵", "⁶", "⁷", "⁸", "⁹"};
    std::string text = power < 0 ? "10⁻" : "10";
    for (const char c : std::to_string(std::abs(power)))
        text += digits[c - '0'];
    return text;
}

std::string log_label(double value) {
    if (value >= 0.999e-3 && value < 0.999e5) return fmt::format("{:.6g}", value);
    const int power = static_cast<int>(std::floor(std::log10(value) + 1e-9));
    const long lead = std::lround(value / std::pow(10.0, power));
    return (lead == 1 ? std::string() : std::to_string(lead) + "·") + power_of_ten(power);
}

/// Power of ten, a multiple of 3, that the labels of a linear axis leave out.
int left_out_power(double low, double high) {
    const double largest = std::max(std::fabs(low), std::fabs(high));
    if (!(largest > 0) || (largest < 1e5 && largest >= 0.05)) return 0;
    return 3 * static_cast<int>(std::floor(std::log10(largest) / 3 + 1e-9));
}

void label_linear(AxisScale& scale, const ChartAxis& axis, double step) {
    const int power = left_out_power(scale.low, scale.high);
    const double factor = std::pow(10.0, -power);
    const int decimals =
        std::max(0, static_cast<int>(-std::floor(std::log10(step * factor) + 1e-9)));
    for (const double tick : scale.ticks)
        scale.labels.push_back(fmt::format("{:.{}f}", tick * factor + 0.0, decimals));
    if (power != 0)
        scale.title = with_unit(axis.title,
                                power_of_ten(power) +
                                    (axis.unit == "1" || axis.unit.empty() ? "" : " " + axis.unit));
}

void scale_of_words(AxisScale& scale, const ChartAxis& axis, std::size_t most) {
    scale.is_words = true;
    scale.low = -0.5;
    scale.high = static_cast<double>(axis.words.size()) - 0.5;
    const std::size_t every = (axis.words.size() + most - 1) / std::max<std::size_t>(most, 1);
    for (std::size_t i = 0; i < axis.words.size(); i += std::max<std::size_t>(every, 1)) {
        scale.ticks.push_back(static_cast<double>(i));
        scale.labels.push_back(axis.words[i]);
    }
}

void linear_range(AxisScale& scale, const ChartAxis& axis, DataRange data, bool to_ticks) {
    if (!data.any) data = {true, 0, 1};
    double span = data.high - data.low;
    if (!(span > 1e-9 * std::max(std::fabs(data.high), std::fabs(data.low)))) {
        span = data.high != 0 ? 0.2 * std::fabs(data.high) : 1;
        data.low -= 0.5 * span;
        data.high += 0.5 * span;
    }
    scale.low = data.low - 0.04 * span;
    scale.high = data.high + 0.04 * span;
    const bool near_zero = to_ticks && data.low >= 0 && data.low < 0.35 * data.high;
    if (data.low >= 0 && (axis.from_zero || near_zero)) scale.low = 0;
    if (data.high <= 0 && (axis.from_zero || (to_ticks && data.high > 0.35 * data.low)))
        scale.high = 0;
}

void log_range(AxisScale& scale, const DataRange& data, bool to_ticks) {
    const double low = data.any ? data.low : 1, high = data.any ? data.high : 10;
    const double widen = std::pow(std::max(high / low, 1.2), 0.05);
    scale.low = low / widen;
    scale.high = high * widen;
    if (!to_ticks) return;
    const auto round = [](double value, bool up) {
        const double power = std::pow(10.0, std::floor(std::log10(value) + 1e-9));
        const double steps[] = {1, 2, 5, 10};
        double found = power;
        for (const double s : steps) {
            if (!up && s * power <= value * (1 + 1e-9)) found = s * power;
            if (up && s * power >= value * (1 - 1e-9)) return s * power;
        }
        return found;
    };
    scale.low = round(scale.low, false);
    scale.high = round(scale.high, true);
}

} // namespace

void DataRange::add(double value) {
    if (!std::isfinite(value)) return;
    low = any ? std::min(low, value) : value;
    high = any ? std::max(high, value) : value;
    any = true;
}

double AxisScale::px(double value) const {
    const double share =
        logarithmic ? std::log(value / low) / std::log(high / low) : (value - low) / (high - low);
    return start + share * (end - start);
}

bool AxisScale::holds(double value) const {
    return std::isfinite(value) && (!logarithmic || value > 0);
}

std::string with_unit(const std::string& title, const std::string& unit) {
    return unit.empty() || unit == "1" ? title : title + " (" + unit + ")";
}

std::vector<double> round_ticks(double low, double high, std::size_t most) {
    const double step = step_for(low, high, most);
    std::vector<double> ticks;
    for (double i = std::ceil(low / step - 1e-9); i <= high / step + 1e-9; ++i)
        ticks.push_back(i * step + 0.0);
    return ticks;
}

std::vector<double> log_ticks(double low, double high, std::size_t most) {
    const int first = static_cast<int>(std::floor(std::log10(low) - 1e-9));
    const int last = static_cast<int>(std::ceil(std::log10(high) + 1e-9));
    std::vector<double> ticks;
    for (const int kind : {0, 1, 2}) { // 1, 2, 5 of each decade; powers alone; every second one ...
        for (int every = 1; every <= (kind == 2 ? last - first + 1 : 1); ++every) {
            ticks.clear();
            for (int n = first; n <= last; ++n) {
                if (kind == 2 && n % every != 0) continue;
                for (const double lead : {1.0, 2.0, 5.0}) {
                    if (kind > 0 && lead > 1) continue;
                    const double tick = lead * std::pow(10.0, n);
                    if (tick >= low * (1 - 1e-9) && tick <= high * (1 + 1e-9))
                        ticks.push_back(tick);
                }
            }
            if (ticks.size() <= most) return ticks;
        }
    }
    return ticks;
}

AxisScale make_scale(const ChartAxis& axis, const DataRange& data, std::size_t most,
                     bool to_ticks) {
    AxisScale scale;
    scale.title = with_unit(axis.title, axis.unit);
    if (!axis.words.empty()) {
        scale_of_words(scale, axis, most);
        return scale;
    }
    DataRange wanted = data;
    for (const auto& end : {axis.from, axis.to})
        if (end) wanted.add(*end);
    scale.logarithmic = axis.logarithmic && (!wanted.any || wanted.low > 0);
    if (scale.logarithmic) {
        log_range(scale, wanted, to_ticks);
        scale.ticks = log_ticks(scale.low, scale.high, most);
        if (scale.ticks.size() >= 2) {
            for (const double tick : scale.ticks)
                scale.labels.push_back(log_label(tick));
            return scale;
        }
    } else {
        linear_range(scale, axis, wanted, to_ticks);
    }
    // A short piece of a logarithmic axis has too few round powers: it gets round differences.
    const double step = step_for(scale.low, scale.high, most);
    if (to_ticks && !scale.logarithmic) {
        scale.low = step * std::floor(scale.low / step + 1e-9);
        scale.high = step * std::ceil(scale.high / step - 1e-9);
    }
    scale.ticks = round_ticks(scale.low, scale.high, most + 1);
    const double used = scale.ticks.size() > 1 ? scale.ticks[1] - scale.ticks[0] : step;
    label_linear(scale, axis, used);
    return scale;
}

} // namespace rille::engine
