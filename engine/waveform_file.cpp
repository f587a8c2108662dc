// SPDX-License-Identifier: Apache-2.0
#include "engine/waveform_file.hpp"

#include "engine/csv_rows.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

constexpr std::size_t samples = 4096;
constexpr std::size_t least_points = 3;

bool holds_a_period(const CsvRows& csv, const std::vector<double>& time,
                    const std::vector<double>& volt, Problems& problems) {
    const std::size_t before = problems.size();
    if (time.size() < least_points) {
        problems.add(
            {csv.name, 0, 0}, "",
            fmt::format("holds {} points; at least {} are due", time.size(), least_points));
        return false;
    }
    for (std::size_t i = 1; i < time.size(); ++i)
        if (!(time[i] > time[i - 1]))
            problems.add(csv.rows[i + 1][0].at, "",
                         fmt::format("{} does not exceed the time {:.12g} before it",
                                     quoted(csv.rows[i + 1][0].text), time[i - 1]));
    const auto [low, high] = std::minmax_element(volt.begin(), volt.end());
    const double swing = *high - *low;
    if (!(swing > 0)) problems.add(csv.rows[1][1].at, "", "the voltage never changes");
    if (std::abs(volt.back() - volt.front()) > 1e-6 * swing)
        problems.add(csv.rows.back()[1].at, "",
                     fmt::format("the period ends at {:.12g} V and starts at {:.12g} V; one whole "
                                 "period is due, its last value equal to the first",
                                 volt.back(), volt.front()));
    return problems.size() == before;
}

std::optional<fluxes::Waveform> waveform_of(const CsvRows& csv, Problems& problems) {
    const std::size_t before = problems.size();
    const auto columns = csv_columns(csv, {"time_us", "voltage_V"}, problems);
    if (problems.size() != before) return std::nullopt;
    const std::vector<double>&time = columns[0], &volt = columns[1];
    if (!holds_a_period(csv, time, volt, problems)) return std::nullopt;
    fluxes::Waveform wave;
    const double length = time.back() - time.front();
    wave.period_s = 1e-6 * length;
    std::size_t next = 1;
    for (std::size_t i = 0; i < samples; ++i) {
        const double t = time.front() + length * static_cast<double>(i) / samples;
        while (next + 1 < time.size() && time[next] < t)
            ++next;
        const double part = (t - time[next - 1]) / (time[next] - time[next - 1]);
        wave.volt.push_back(volt[next - 1] + part * (volt[next] - volt[next - 1]));
    }
    return wave;
}

} // namespace

std::optional<fluxes::Waveform> parse_waveform(const std::string& text, const std::string& shown,
                                               Problems& problems) {
    return waveform_of(split_csv(text, shown), problems);
}

std::optional<fluxes::Waveform> read_waveform(const std::string& path, const std::string& shown,
                                              Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, shown, problems);
    if (problems.size() != before) return std::nullopt;
    return waveform_of(csv, problems);
}

} // namespace rille::engine
