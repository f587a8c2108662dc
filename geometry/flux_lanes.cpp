// SPDX-License-Identifier: Apache-2.0
#include "geometry/flux_lanes.hpp"

#include "geometry/slopes.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr int count = FluxLanes::count;

/// The box of slopes of a lane in polar form, horizontal magnitude against z; largest |dH/dp| along
/// both; and of the horizontal one along x and y.
struct Boxes {
    FluxLanes::Values h_middle, z_middle, wide, tall, horizontal, vertical, share_x, share_y;
};

} // namespace

// Loops without branches, for the widest vectors that the processor has, chosen when the program
// starts. Operations are those of one lane whatever the width: none is contracted or reordered.
#if defined(__x86_64__) && defined(__GNUC__)
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void slopes_of_lanes(FluxLanes&, bool planar, double inverse_spacing);
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void tilts_of_lanes(FluxLanes&);
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void boxes_of_lanes(const FluxLanes&, bool planar, Boxes&);
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void cones_of_lanes(FluxLanes&, bool planar, Boxes&);
[[gnu::target_clones("avx512f", "avx2", "default")]] //
void changes_of_lanes(FluxLanes&, bool planar, Boxes&);
#endif

void slopes_of_lanes(FluxLanes& l, bool planar, double inverse_spacing) {
    for (int axis = 0; axis < 3; ++axis) {
        if (planar && axis == 1) continue;
        const double *back = l.back[axis].at, *ahead = l.ahead[axis].at, *bend = l.bend[axis].at;
        const double *left = l.bend_left[axis].at, *right = l.bend_right[axis].at;
        double *minus = l.minus[axis].at, *plus = l.plus[axis].at;
        for (int n = 0; n < count; ++n) {
            minus[n] = (back[n] + 0.5 * limited_bend(bend[n], left[n], Limiter::directional)) *
                       inverse_spacing;
            plus[n] = (ahead[n] - 0.5 * limited_bend(bend[n], right[n], Limiter::directional)) *
                      inverse_spacing;
        }
    }
    for (int n = 0; n < count; ++n) {
        const double gx = 0.5 * (l.minus[0][n] + l.plus[0][n]);
        const double gy = 0.5 * (l.minus[1][n] + l.plus[1][n]);
        const double gz = 0.5 * (l.minus[2][n] + l.plus[2][n]);
        l.horizontal[n] = planar ? gx : std::sqrt(gx * gx + gy * gy);
        l.vertical[n] = gz;
    }
    for (int n = 0; n < count; ++n) {
        const double horizontal = l.horizontal[n], vertical = l.vertical[n];
        l.length[n] = std::sqrt(horizontal * horizontal + vertical * vertical);
        const double across = std::fabs(horizontal), sum = across + std::fabs(vertical);
        const double part = (vertical < 0 ? vertical : across) / (sum > 0 ? sum : 1.0);
        const double turn = vertical < 0 ? 1 - part : part;
        const int bin = static_cast<int>(turn * (0.5 * turn_bins));
        l.turn_bin[n] = std::min(std::max(bin, 0), turn_bins);
    }
}

void tilts_of_lanes(FluxLanes& l) {
    for (int n = 0; n < count; ++n) {
        const double horizontal = l.horizontal[n], length = l.length[n] > 0 ? l.length[n] : 1.0;
        const double cosine = l.vertical[n] / length, sine = std::fabs(horizontal) / length;
        const double beyond = sine * l.mark_cosine[n] - cosine * l.mark_sine[n];
        l.angle[n] = std::copysign(l.mark_angle[n] + short_arcsine(beyond), horizontal);
        l.sine[n] = std::copysign(sine, horizontal);
        l.cosine[n] = cosine;
    }
}

namespace {

inline double share_of(double one, double other) {
    const double square = one * one + other * other;
    return square > 0 ? one / std::sqrt(square > 0 ? square : 1.0) : 0.0;
}

/// Largest |dH/dp| of a lane so far, as WaveSpeed.
struct Most {
    double horizontal = 0, vertical = 0;
    void take(double rate, double slope, double sine, double cosine, double weight) {
        const double h = weight * std::fabs(rate * sine + slope * cosine);
        const double v = weight * std::fabs(rate * cosine - slope * sine);
        horizontal = horizontal < h ? h : horizontal;
        vertical = vertical < v ? v : vertical;
    }
};

inline bool crosses(double low, double high, double axis) {
    return (low < axis) & (high > axis);
}

} // namespace

void boxes_of_lanes(const FluxLanes& l, bool planar, Boxes& b) {
    for (int n = 0; n < count; ++n) {
        const double minus = l.minus[2][n], plus = l.plus[2][n];
        const double low = minus < plus ? minus : plus, high = minus < plus ? plus : minus;
        b.z_middle[n] = 0.5 * (low + high);
        b.tall[n] = high - low;
    }
    if (planar) {
        for (int n = 0; n < count; ++n) {
            const double minus = l.minus[0][n], plus = l.plus[0][n];
            const double low = minus < plus ? minus : plus, high = minus < plus ? plus : minus;
            b.h_middle[n] = 0.5 * (low + high);
            b.wide[n] = high - low;
        }
        return;
    }
    for (int n = 0; n < count; ++n) {
        const double x0 = l.minus[0][n], x1 = l.plus[0][n], y0 = l.minus[1][n], y1 = l.plus[1][n];
        const double x_low = least_magnitude(x0, x1), x_high = most_magnitude(x0, x1);
        const double y_low = least_magnitude(y0, y1), y_high = most_magnitude(y0, y1);
        const double low = std::sqrt(x_low * x_low + y_low * y_low);
        const double high = std::sqrt(x_high * x_high + y_high * y_high);
        b.h_middle[n] = 0.5 * (low + high);
        b.wide[n] = high - low;
        b.share_x[n] = share_of(x_high, y_low);
        b.share_y[n] = share_of(y_high, x_low);
    }
}

void cones_of_lanes(FluxLanes& l, bool planar, Boxes& b) {
    const double lowest = planar ? -pi : 0;
    for (int n = 0; n < count; ++n) {
        const double h = b.h_middle[n], z = b.z_middle[n], wide = b.wide[n], tall = b.tall[n];
        const double square = wide * wide + tall * tall, middle = h * h + z * z;
        const bool cone = square < narrow_box * narrow_box * middle;
        const double spread = 1.1 * std::sqrt((cone ? square : 0.0) / (cone ? middle : 1.0));
        const double angle = l.angle[n], sine = l.sine[n], cosine = l.cosine[n];
        const double turn = 1 - 0.5 * spread * spread;
        const double from = angle - spread, to = angle + spread;
        const double from_sine = sine * turn - cosine * spread;
        const double from_cosine = cosine * turn + sine * spread;
        const double to_sine = sine * turn + cosine * spread;
        const double to_cosine = cosine * turn - sine * spread;

        const double a0 = l.node_angle[0][n], a1 = l.node_angle[1][n];
        const double a2 = l.node_angle[2][n], a3 = l.node_angle[3][n];
        const double v0 = l.value[0][n], v1 = l.value[1][n];
        const double v2 = l.value[2][n], v3 = l.value[3][n];
        const double slope0 = (v1 - v0) * l.inverse_width[0][n];
        const double slope1 = (v2 - v1) * l.inverse_width[1][n];
        const double slope2 = (v3 - v2) * l.inverse_width[2][n];
        const bool below = from<a1, above = to> a2;
        const double count_below = below ? 1.0 : 0.0, count_above = above ? 1.0 : 0.0;
        const double first = below ? slope0 : slope1, last = above ? slope2 : slope1;
        const double sine1 = l.node_sine[0][n], cosine1 = l.node_cosine[0][n];
        const double sine2 = l.node_sine[1][n], cosine2 = l.node_cosine[1][n];
        Most most;
        most.take((below ? v0 : v1) + first * (from - (below ? a0 : a1)), first, from_sine,
                  from_cosine, 1);
        most.take((above ? v2 : v1) + last * (to - (above ? a2 : a1)), last, to_sine, to_cosine, 1);
        most.take(v1, slope0, sine1, cosine1, count_below);
        most.take(v1, slope1, sine1, cosine1, count_below);
        most.take(v2, slope1, sine2, cosine2, count_above);
        most.take(v2, slope2, sine2, cosine2, count_above);
        b.horizontal[n] = most.horizontal;
        b.vertical[n] = most.vertical;

        const bool past_axis =
            crosses(from, to, -0.5 * pi) | crosses(from, to, 0.0) | crosses(from, to, 0.5 * pi);
        const bool ordinary = cone & (from >= lowest) & (to <= pi) & (from >= a0) & (to <= a3) &
                              !past_axis & (l.length[n] > 0);
        l.ordinary[n] = ordinary ? 1.0 : 0.0;
        l.rate[n] = v1 + (v2 - v1) * ((angle - a1) * l.inverse_width[1][n]);
    }
}

void changes_of_lanes(FluxLanes& l, bool planar, Boxes& b) {
    for (int n = 0; n < count; ++n) {
        b.share_x[n] = planar ? b.horizontal[n] : b.horizontal[n] * b.share_x[n];
        b.share_y[n] = planar ? 0.0 : b.horizontal[n] * b.share_y[n];
    }
    for (int n = 0; n < count; ++n) {
        const double speed_x = b.share_x[n], speed_y = b.share_y[n], speed_z = b.vertical[n];
        const double dx = l.plus[0][n] - l.minus[0][n], dy = l.plus[1][n] - l.minus[1][n];
        const double dz = l.plus[2][n] - l.minus[2][n];
        l.waves[n] = speed_x + speed_y + speed_z;
        double change = l.rate[n] * l.length[n];
        change += 0.5 * speed_x * dx;
        change += 0.5 * speed_y * dy;
        change += 0.5 * speed_z * dz;
        l.change[n] = change;
        const double mx = 0.5 * (l.minus[0][n] + l.plus[0][n]);
        const double my = 0.5 * (l.minus[1][n] + l.plus[1][n]), mz = l.vertical[n];
        const double apart = dx * dx + dy * dy + dz * dz, steep = mx * mx + my * my + mz * mz;
        l.smooth[n] = apart < 0.01 * steep ? 1.0 : 0.0;
    }
}

void FluxLanes::find_slopes(bool planar, double inverse_spacing) {
    slopes_of_lanes(*this, planar, inverse_spacing);
}
void FluxLanes::find_tilts() {
    tilts_of_lanes(*this);
}
void FluxLanes::find_fluxes(bool planar) {
    Boxes boxes;
    boxes_of_lanes(*this, planar, boxes);
    cones_of_lanes(*this, planar, boxes);
    changes_of_lanes(*this, planar, boxes);
}

} // namespace rille::geometry
