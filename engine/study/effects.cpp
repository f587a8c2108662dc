// SPDX-License-Identifier: Apache-2.0
#include "engine/study/effects.hpp"

#include "fluxes/sampling.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <numeric>

namespace rille::engine {

namespace {

using Rows = std::vector<std::size_t>;

constexpr std::size_t least_points = 12, most_levels = 32;
constexpr int resamples = 400, noise_draws = 2000;
constexpr double student_seven = 2.364624; // 97.5 %, 7 degrees of freedom: eight batches
constexpr double normal_95 = 1.959964;

/// Which level of its axis each row has.
struct Levels {
    std::vector<int> of_row;
    std::vector<EffectLevel> list;
};

double mean_of(const std::vector<double>& y, const Rows& rows) {
    double sum = 0;
    for (const std::size_t r : rows)
        sum += y[r];
    return rows.empty() ? 0 : sum / static_cast<double>(rows.size());
}

double squares_about(const std::vector<double>& y, const Rows& rows, double mean) {
    double sum = 0;
    for (const std::size_t r : rows)
        sum += (y[r] - mean) * (y[r] - mean);
    return sum;
}

std::vector<double> distinct(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    values.erase(std::unique(values.begin(), values.end()), values.end());
    return values;
}

/// One level a value where values repeat, else parts with equally many points.
Levels levels_of(const EffectAxis& axis) {
    const std::size_t n = axis.values.size();
    const std::vector<double> values = distinct(axis.values);
    Levels levels;
    levels.of_row.resize(n);
    const bool repeats = values.size() <= most_levels && values.size() * 2 <= n;
    if (repeats || !axis.words.empty()) {
        for (const double value : values) {
            EffectLevel level;
            level.from = level.to = value;
            const auto word = static_cast<std::size_t>(value);
            if (word < axis.words.size()) level.word = axis.words[word];
            levels.list.push_back(level);
        }
        for (std::size_t r = 0; r < n; ++r)
            levels.of_row[r] = static_cast<int>(
                std::lower_bound(values.begin(), values.end(), axis.values[r]) - values.begin());
        return levels;
    }
    const auto root = static_cast<std::size_t>(0.5 * std::sqrt(static_cast<double>(n)));
    const std::size_t parts = std::clamp<std::size_t>(root, 3, most_levels);
    Rows order(n);
    std::iota(order.begin(), order.end(), 0);
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return axis.values[a] < axis.values[b]; });
    levels.list.resize(parts);
    for (std::size_t k = 0; k < n; ++k) {
        const std::size_t part = k * parts / n;
        EffectLevel& level = levels.list[part];
        if (k == 0 || (k - 1) * parts / n != part) level.from = axis.values[order[k]];
        level.to = axis.values[order[k]];
        levels.of_row[order[k]] = static_cast<int>(part);
    }
    return levels;
}

/// Whether every combination of levels stands in the rows, each equally often.
bool is_full_grid(const EffectData& data, const std::vector<Levels>& levels) {
    std::size_t product = 1;
    for (const Levels& axis : levels) {
        for (const EffectLevel& level : axis.list)
            if (level.from != level.to) return false;
        product *= axis.list.size();
        if (product > data.y.size()) return false;
    }
    std::map<std::vector<int>, std::size_t> count;
    for (std::size_t r = 0; r < data.y.size(); ++r) {
        std::vector<int> key;
        for (const Levels& axis : levels)
            key.push_back(axis.of_row[r]);
        ++count[key];
    }
    return count.size() == product &&
           std::all_of(count.begin(), count.end(),
                       [&](const auto& entry) { return entry.second * product == data.y.size(); });
}

/// Variance of one point's noise: from repeats of the same combination, else from the sampling
/// errors.
double noise_variance(const EffectData& data) {
    std::map<std::vector<double>, Rows> same;
    for (std::size_t r = 0; r < data.y.size(); ++r) {
        std::vector<double> key;
        for (const EffectAxis& axis : data.axes)
            key.push_back(axis.values[r]);
        same[key].push_back(r);
    }
    double squares = 0;
    std::size_t freedom = 0;
    for (const auto& [key, rows] : same) {
        squares += squares_about(data.y, rows, mean_of(data.y, rows));
        freedom += rows.size() - 1;
    }
    if (freedom >= 3) return squares / static_cast<double>(freedom);
    double sum = 0;
    for (const double error : data.error)
        sum += error * error / (student_seven * student_seven);
    return data.error.empty() ? 0 : sum / static_cast<double>(data.error.size());
}

/// Share of the variance between levels. `noise` at least 0: variance of a point's noise, for
/// which the spread is corrected; below 0: corrected for the spread within levels.
std::optional<double> share_between(const std::vector<double>& y, const Rows& rows,
                                    const Levels& levels, double noise) {
    const std::size_t count = levels.list.size();
    std::vector<double> sum(count, 0.0);
    std::vector<double> members(count, 0.0);
    for (const std::size_t r : rows) {
        sum[levels.of_row[r]] += y[r];
        members[levels.of_row[r]] += 1;
    }
    const double mean = mean_of(y, rows), total = squares_about(y, rows, mean);
    double between = 0, used = 0;
    for (std::size_t l = 0; l < count; ++l) {
        if (members[l] == 0) continue;
        const double off = sum[l] / members[l] - mean;
        between += members[l] * off * off;
        used += 1;
    }
    const double freedom = static_cast<double>(rows.size()) - used;
    if (!(total > 0) || used < 2 || freedom < 1) return std::nullopt;
    const double each = noise >= 0 ? noise : (total - between) / freedom;
    const double truth =
        noise >= 0 ? total - noise * (static_cast<double>(rows.size()) - 1) : total;
    if (!(truth > 0)) return std::nullopt;
    return (between - (used - 1) * each) / truth;
}

double standard_normal(std::uint64_t key) {
    const double u = 1 - fluxes::unit_interval(fluxes::stream_key(key, 1));
    const double v = fluxes::unit_interval(fluxes::stream_key(key, 2));
    return std::sqrt(-2 * std::log(u)) * std::cos(6.283185307179586 * v);
}

/// 2.5 % and 97.5 % of the draws.
void set_interval(std::vector<double> draws, AxisEffect& effect) {
    if (draws.empty()) return;
    std::sort(draws.begin(), draws.end());
    const auto at = [&](double share) {
        const double place = share * static_cast<double>(draws.size() - 1);
        const auto low = static_cast<std::size_t>(place);
        const std::size_t high = std::min(low + 1, draws.size() - 1);
        return draws[low] + (place - static_cast<double>(low)) * (draws[high] - draws[low]);
    };
    effect.low = std::min(at(0.025), *effect.first_order);
    effect.high = std::max(at(0.975), *effect.first_order);
}

class Analysis {
public:
    Analysis(const EffectData& data, std::uint64_t seed)
        : data_(data), seed_(seed), all_(data.y.size()) {
        std::iota(all_.begin(), all_.end(), 0);
        for (const EffectAxis& axis : data.axes)
            levels_.push_back(levels_of(axis));
        noise_ = noise_variance(data);
        full_ = is_full_grid(data, levels_);
    }

    Effects run() {
        Effects result;
        result.response = data_.response;
        result.unit = data_.unit;
        result.points = data_.y.size();
        result.left_out = data_.left_out;
        result.is_full_grid = full_;
        result.mean = mean_of(data_.y, all_);
        const double squares = squares_about(data_.y, all_, result.mean);
        if (all_.size() > 1)
            result.deviation = std::sqrt(squares / static_cast<double>(all_.size() - 1));
        result.method =
            full_ ? "full grid: means over levels, corrected for the noise of the points; 95 % "
                    "interval from that noise"
                  : "parts of each axis: analysis of variance; 95 % interval by bootstrap over "
                    "points";
        for (std::size_t a = 0; a < levels_.size(); ++a)
            result.axes.push_back(effect(a));
        add_intervals(result);
        double sum = 0;
        bool all = !result.axes.empty();
        for (const AxisEffect& axis : result.axes) {
            all = all && axis.first_order.has_value();
            sum += axis.first_order.value_or(0);
        }
        if (all) result.together = std::max(0.0, 1 - sum);
        return result;
    }

private:
    AxisEffect effect(std::size_t a) const {
        AxisEffect effect;
        effect.label = data_.axes[a].label;
        effect.unit = data_.axes[a].unit;
        effect.levels = levels_[a].list;
        std::vector<Rows> members(effect.levels.size());
        for (const std::size_t r : all_)
            members[levels_[a].of_row[r]].push_back(r);
        double low = 0, high = 0;
        for (std::size_t l = 0; l < members.size(); ++l) {
            EffectLevel& level = effect.levels[l];
            const auto n = static_cast<double>(members[l].size());
            level.count = members[l].size();
            level.mean = mean_of(data_.y, members[l]);
            const double spread =
                full_ ? noise_
                      : squares_about(data_.y, members[l], level.mean) / std::max(1.0, n - 1);
            level.error = n > 0 ? normal_95 * std::sqrt(spread / n) : 0;
            low = l == 0 ? level.mean : std::min(low, level.mean);
            high = l == 0 ? level.mean : std::max(high, level.mean);
        }
        effect.span = high - low;
        judge(a, effect);
        return effect;
    }

    void judge(std::size_t a, AxisEffect& effect) const {
        if (effect.levels.size() < 2)
            effect.note = "one value only";
        else if (!full_ && all_.size() < least_points)
            effect.note = fmt::format("{} points are too few; {} or more, or a full grid, say it",
                                      all_.size(), least_points);
        else
            effect.first_order = share_between(data_.y, all_, levels_[a], full_ ? noise_ : -1);
        if (!effect.first_order && effect.note.empty())
            effect.note = "the response does not vary by more than its noise";
        if (effect.first_order) effect.first_order = std::clamp(*effect.first_order, 0.0, 1.0);
    }

    void add_intervals(Effects& result) const {
        std::vector<std::vector<double>> draws(levels_.size());
        const int count = full_ ? noise_draws : resamples;
        const auto budget = static_cast<int>(2e8 / (1.0 + static_cast<double>(all_.size())));
        for (int b = 0; b < std::clamp(budget, 50, count); ++b) {
            std::vector<double> y = data_.y;
            Rows rows = all_;
            for (std::size_t r = 0; r < rows.size(); ++r)
                if (full_)
                    y[r] += std::sqrt(noise_) * standard_normal(fluxes::stream_key(seed_, b, r));
                else
                    rows[r] = static_cast<std::size_t>(
                        fluxes::unit_interval(fluxes::stream_key(seed_, b, r)) *
                        static_cast<double>(rows.size()));
            for (std::size_t a = 0; a < levels_.size(); ++a) {
                if (!result.axes[a].first_order) continue;
                // The noise is in the draw twice: once as it was, once as drawn.
                const auto share = share_between(y, rows, levels_[a], full_ ? 2 * noise_ : -1);
                if (share) draws[a].push_back(std::clamp(*share, 0.0, 1.0));
            }
        }
        for (std::size_t a = 0; a < levels_.size(); ++a)
            if (result.axes[a].first_order) set_interval(draws[a], result.axes[a]);
    }

    const EffectData& data_;
    std::uint64_t seed_;
    Rows all_;
    std::vector<Levels> levels_;
    double noise_ = 0;
    bool full_ = false;
};

} // namespace

Effects effects_of(const EffectData& data, std::uint64_t seed) {
    return Analysis(data, seed).run();
}

} // namespace rille::engine
