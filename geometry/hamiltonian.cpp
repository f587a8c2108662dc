// SPDX-License-Identifier: Apache-2.0
#include "geometry/hamiltonian.hpp"

#include "geometry/band_topology.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;

Tilt exact_tilt(double horizontal, double vertical) {
    const double length = std::sqrt(horizontal * horizontal + vertical * vertical);
    if (length == 0) return {};
    return {std::atan2(horizontal, vertical), horizontal / length, vertical / length, -1};
}

/// Runs from 0 to 2 as the angle from +z towards the horizontal runs from 0 to pi, in its place;
/// horizontal >= 0.
double turn_of(double horizontal, double vertical) {
    const double sum = horizontal + std::fabs(vertical);
    return vertical < 0 ? 1 - vertical / sum : horizontal / sum;
}

} // namespace

Tilt tilt_of(bool planar, double gx, double gy, double gz) {
    return exact_tilt(planar ? gx : std::sqrt(gx * gx + gy * gy), gz);
}

RateTables::RateTables(const NormalRates& rates) : rates_(rates) {
    const std::vector<double>& angle = rates.angles;
    const std::size_t n = angle.size(), rows = rates.material.size();
    RILLE_CHECK(n >= 2 && rates.table.size() == rows * n, "rate tables of the wrong size");
    for (std::size_t a = 0; a < n; ++a) {
        sine_.push_back(std::sin(angle[a]));
        cosine_.push_back(std::cos(angle[a]));
        if (a + 1 < n) inverse_width_.push_back(1 / (angle[a + 1] - angle[a]));
    }
    const int bins = static_cast<int>(4 * n);
    bins_per_radian_ = bins / (angle.back() - angle.front());
    int s = 0;
    for (int b = 0; b < bins; ++b) {
        const double start = angle.front() + b / bins_per_radian_;
        while (s + 2 < static_cast<int>(n) && angle[s + 1] <= start)
            ++s;
        bin_.push_back(s);
    }
    for (int b = 0; b <= turn_bins; ++b) {
        const double turn = 2.0 * b / turn_bins;
        marks_.push_back(exact_tilt(turn < 1 ? turn : 2 - turn, 1 - turn));
    }
    constant_.resize(rows);
    for_ranges(rows, [&](std::size_t begin, std::size_t end) {
        for (std::size_t r = begin; r < end; ++r) {
            const double* v = values(static_cast<int>(r));
            constant_[r] = std::all_of(v, v + n, [v](double rate) { return rate == v[0]; });
        }
    });
}

int RateTables::segment(double angle) const {
    const int last = static_cast<int>(rates_.angles.size()) - 2;
    const int b = static_cast<int>((angle - rates_.angles.front()) * bins_per_radian_);
    int s = bin_[std::clamp(b, 0, static_cast<int>(bin_.size()) - 1)];
    s += s < last && angle > rates_.angles[s + 1]; // one step without a branch that is hard to tell
    while (s < last && angle > rates_.angles[s + 1])
        ++s;
    while (s > 0 && angle < rates_.angles[s])
        --s;
    return s;
}

int RateTables::segment(const Tilt& t) const {
    if (t.segment < 0) return segment(t.angle);
    const int last = static_cast<int>(rates_.angles.size()) - 2;
    int s = t.segment;
    while (s < last && t.angle > rates_.angles[s + 1])
        ++s;
    while (s > 0 && t.angle < rates_.angles[s])
        --s;
    return s;
}

Tilt RateTables::tilt(double horizontal, double vertical, double& length) const {
    Tilt t;
    const double across = std::fabs(horizontal);
    length = std::sqrt(horizontal * horizontal + vertical * vertical);
    if (length > 0) {
        const int bin = static_cast<int>(turn_of(across, vertical) * (0.5 * turn_bins));
        const Tilt& mark = marks_[std::clamp(bin, 0, turn_bins)];

        t.cosine = vertical / length;
        t.sine = across / length;
        const double beyond = t.sine * mark.cosine - t.cosine * mark.sine;
        t.angle = std::copysign(mark.angle + short_arcsine(beyond), horizontal);
        t.sine = std::copysign(t.sine, horizontal);
    }
    return t;
}

void RateTables::look_up_marks(FluxLanes& lanes, int used) const {
    for (int n = 0; n < used; ++n) {
        const Tilt& mark = marks_[lanes.turn_bin[n]];
        lanes.mark_angle[n] = mark.angle;
        lanes.mark_sine[n] = mark.sine;
        lanes.mark_cosine[n] = mark.cosine;
    }
}

bool RateTables::look_up_nodes(FluxLanes& lanes, int n, const RateWindow& window) const {
    const int s = segment(lanes.angle[n]), last = static_cast<int>(rates_.angles.size()) - 2;
    const bool held = s > window.first && s + 2 < window.first + RateWindow::size;
    if (!held || s < 1 || s >= last) return false;
    const double *angle = rates_.angles.data() + s - 1,
                 *value = window.value + (s - 1 - window.first);
    for (int k = 0; k < 4; ++k) {
        lanes.node_angle[k][n] = angle[k];
        lanes.value[k][n] = value[k];
    }
    for (int k = 0; k < 3; ++k)
        lanes.inverse_width[k][n] = inverse_width_[s - 1 + k];
    for (int k = 0; k < 2; ++k) {
        lanes.node_sine[k][n] = sine_[s + k];
        lanes.node_cosine[k][n] = cosine_[s + k];
    }
    return true;
}

RateWindow RateTables::window(int row, double angle) const {
    RateWindow out;
    if (row < 0) return out;
    const int n = static_cast<int>(rates_.angles.size());
    out.row = row;
    out.first =
        static_cast<short>(std::clamp(segment(angle) - 2, 0, std::max(0, n - RateWindow::size)));
    out.constant = constant(row);
    out.moves = moves(row);
    std::copy_n(values(row) + out.first, std::min(n, RateWindow::size), out.value);
    return out;
}

WaveSpeed RateTables::wave_speed(int row, const Tilt& low, const Tilt& high,
                                 const RateWindow& window) const {
    // H = R(t) rho with slopes (rho sin t, rho cos t): dH/d(horizontal) = R sin t + R' cos t and
    // dH/dz = R cos t - R' sin t; between nodes they are extremal where cos t or sin t vanishes.
    const int first = segment(low), last = segment(high);
    const double* v = values(row, first, last, window);
    WaveSpeed out;
    for (int s = first; s <= last; ++s, ++v) {
        const double slope = (v[1] - v[0]) * inverse_width_[s];
        const auto take = [&](double angle, double sine, double cosine) {
            const double rate = v[0] + slope * (angle - rates_.angles[s]);
            out.horizontal = std::max(out.horizontal, std::fabs(rate * sine + slope * cosine));
            out.vertical = std::max(out.vertical, std::fabs(rate * cosine - slope * sine));
        };
        const double from = s == first ? low.angle : rates_.angles[s];
        const double to = s == last ? high.angle : rates_.angles[s + 1];
        if (s == first)
            take(low.angle, low.sine, low.cosine);
        else
            take(from, sine_[s], cosine_[s]);
        if (s == last)
            take(high.angle, high.sine, high.cosine);
        else
            take(to, sine_[s + 1], cosine_[s + 1]);
        if (from < 0 && to > 0) take(0, 0, 1);
        if (from < 0.5 * pi && to > 0.5 * pi) take(0.5 * pi, 1, 0);
        if (from < -0.5 * pi && to > -0.5 * pi) take(-0.5 * pi, -1, 0);
    }
    return out;
}

static WaveSpeed most(const WaveSpeed& a, const WaveSpeed& b) {
    return {std::max(a.horizontal, b.horizontal), std::max(a.vertical, b.vertical)};
}

WaveSpeed RateTables::wave_speed_of_cone(int row, const Tilt& low, const Tilt& high,
                                         const RateWindow& window) const {
    const int s = low.segment, last = static_cast<int>(rates_.angles.size()) - 2;
    const double* a = rates_.angles.data() + s;
    // Most cones end in the segment of their middle or the next one. Which of them is a toss-up, so
    // all three are looked at and what does not count is multiplied by 0: no branch to guess.
    if (s < 1 || s >= last || low.angle < a[-1] || high.angle > a[2])
        return wave_speed(row, low, high, window);
    const double* v = values(row, s - 1, s + 1, window) + 1;
    const double* w = inverse_width_.data() + s;
    const double slope[3] = {(v[0] - v[-1]) * w[-1], (v[1] - v[0]) * w[0], (v[2] - v[1]) * w[1]};
    WaveSpeed out;
    const auto take = [&out](double rate, double by_tilt, double sine, double cosine,
                             double count) {
        out.horizontal =
            std::max(out.horizontal, count * std::fabs(rate * sine + by_tilt * cosine));
        out.vertical = std::max(out.vertical, count * std::fabs(rate * cosine - by_tilt * sine));
    };
    const int below = low.angle<a[0], above = high.angle> a[1];
    const double from = slope[1 - below], to = slope[1 + above];
    take(v[-below] + from * (low.angle - a[-below]), from, low.sine, low.cosine, 1);
    take(v[above] + to * (high.angle - a[above]), to, high.sine, high.cosine, 1);
    take(v[0], slope[0], sine_[s], cosine_[s], below);
    take(v[0], slope[1], sine_[s], cosine_[s], below);
    take(v[1], slope[1], sine_[s + 1], cosine_[s + 1], above);
    take(v[1], slope[2], sine_[s + 1], cosine_[s + 1], above);
    for (const double axis : {-0.5, 0.0, 0.5})
        if (low.angle < axis * pi && high.angle > axis * pi)
            return most(out, wave_speed(row, low, high, window));
    return out;
}

namespace {

/// The box of slopes of a cell in polar form: horizontal magnitude against z.
struct Box {
    double h_low, h_high; ///< signed p in 2-D, magnitude of (p, q) in 3-D
    double z_low, z_high;
};

/// `low` and `high` are the least and the largest magnitude along each axis.
Box box_of(bool planar, const Slopes& s, const double* low, const double* high) {
    Box b;
    b.z_low = std::min(s.minus[2], s.plus[2]);
    b.z_high = std::max(s.minus[2], s.plus[2]);
    if (planar) {
        b.h_low = std::min(s.minus[0], s.plus[0]);
        b.h_high = std::max(s.minus[0], s.plus[0]);
        return b;
    }
    b.h_low = std::sqrt(low[0] * low[0] + low[1] * low[1]);
    b.h_high = std::sqrt(high[0] * high[0] + high[1] * high[1]);
    return b;
}

Tilt turned(const Tilt& t, double by) {
    const double c = 1 - 0.5 * by * by;
    return {t.angle + by, t.sine * c + t.cosine * by, t.cosine * c - t.sine * by, t.segment};
}

/// Wave speed over all tilts a box of slopes holds.
WaveSpeed over_box(const RateTables& tables, int row, bool planar, const Box& b, const Tilt& mean,
                   const RateWindow& window) {
    const double lowest = planar ? -pi : 0;
    const double wide = b.h_high - b.h_low, high = b.z_high - b.z_low;
    const double square = wide * wide + high * high;
    const double h = 0.5 * (b.h_low + b.h_high), z = 0.5 * (b.z_low + b.z_high);
    const double middle = h * h + z * z;
    if (square < narrow_box * narrow_box * middle) {
        // The mean slopes lie in the box, so a cone about them as wide as its diagonal holds it.
        const double spread = 1.1 * std::sqrt(square / middle);
        const Tilt low = turned(mean, -spread), up = turned(mean, spread);
        if (low.angle >= lowest && up.angle <= pi)
            return tables.wave_speed_of_cone(row, low, up, window);
    }
    const Tilt full_low{lowest, 0, planar ? -1.0 : 1.0, -1}, full_high{pi, 0, -1, -1};
    const bool holds_origin = b.h_low <= 0 && b.h_high >= 0 && b.z_low <= 0 && b.z_high >= 0;
    if (holds_origin) return tables.wave_speed(row, full_low, full_high, window);
    Tilt corner[4] = {exact_tilt(b.h_low, b.z_low), exact_tilt(b.h_low, b.z_high),
                      exact_tilt(b.h_high, b.z_low), exact_tilt(b.h_high, b.z_high)};
    std::sort(corner, corner + 4, [](const Tilt& a, const Tilt& c) { return a.angle < c.angle; });
    const bool wraps = planar && b.h_low < 0 && b.h_high > 0 && b.z_high < 0;
    if (!wraps) return tables.wave_speed(row, corner[0], corner[3], window);
    // Facing down across +-pi: the tilts are those above the least positive and below the largest
    // negative corner.
    Tilt positive = full_high, negative = full_low;
    for (const Tilt& t : corner) {
        if (t.angle > 0 && t.angle < positive.angle) positive = t;
        if (t.angle < 0 && t.angle > negative.angle) negative = t;
    }
    return most(tables.wave_speed(row, positive, full_high, window),
                tables.wave_speed(row, full_low, negative, window));
}

std::array<double, 3> of_row(const RateTables& tables, int row, bool planar, const Slopes& s,
                             const Tilt& mean, const RateWindow& window) {
    if (row < 0) return {0, 0, 0};
    double low[3], high[3];
    for (int a = 0; a < 3; ++a) {
        low[a] = least_magnitude(s.minus[a], s.plus[a]);
        high[a] = most_magnitude(s.minus[a], s.plus[a]);
    }
    const auto share = [](double one, double other_square) {
        const double square = one * one + other_square;
        return square > 0 ? one / std::sqrt(square) : 0;
    };
    if (tables.constant(row)) {
        const double rate = std::fabs(tables.rate(row, 0));
        return {rate * share(high[0], low[1] * low[1] + low[2] * low[2]),
                rate * share(high[1], low[0] * low[0] + low[2] * low[2]),
                rate * share(high[2], low[0] * low[0] + low[1] * low[1])};
    }
    const WaveSpeed w = over_box(tables, row, planar, box_of(planar, s, low, high), mean, window);
    if (planar) return {w.horizontal, 0, w.vertical};
    return {w.horizontal * share(high[0], low[1] * low[1]),
            w.horizontal * share(high[1], low[0] * low[0]), w.vertical};
}

std::array<double, 3> dissipation(const RateTables& tables, const RowPair& rows,
                                  const RateWindow& window, bool planar, const Slopes& s,
                                  const Tilt& mean) {
    std::array<double, 3> a = of_row(tables, rows.row, planar, s, mean, window);
    if (rows.share > 0) {
        const std::array<double, 3> other = of_row(tables, rows.other, planar, s, mean, window);
        for (int axis = 0; axis < 3; ++axis)
            a[axis] += rows.share * (other[axis] - a[axis]);
    }
    return a;
}

} // namespace

double upwind_steepness(const Slopes& s, bool recedes, double& waves) {
    double square = 0, sum = 0;
    for (int a = 0; a < 3; ++a) {
        const double up = recedes ? s.plus[a] : s.minus[a];
        const double down = recedes ? s.minus[a] : s.plus[a];
        const double g = std::max(std::max(up, 0.0), -std::min(down, 0.0));
        square += g * g;
        sum += g;
    }
    const double length = std::sqrt(square);
    waves = length > 0 ? sum / length : 0;
    return length;
}

double lax_friedrichs(const RateTables& tables, const RowPair& rows, const RateWindow& window,
                      bool planar, const Slopes& s, Speed& speed) {
    const double gx = s.mean(0), gy = s.mean(1);
    double length = 0;
    Tilt mean = tables.tilt(planar ? gx : std::sqrt(gx * gx + gy * gy), s.mean(2), length);
    tables.find_segment(mean);
    speed.rate = tables.rate(rows, mean, window);
    const std::array<double, 3> a = dissipation(tables, rows, window, planar, s, mean);
    speed.waves = a[0] + a[1] + a[2];
    speed.smooth = smooth(s);
    double change = speed.rate * length;
    for (int axis = 0; axis < 3; ++axis)
        change += 0.5 * a[axis] * (s.plus[axis] - s.minus[axis]);
    return change;
}

} // namespace rille::geometry
