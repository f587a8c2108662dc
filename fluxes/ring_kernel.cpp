// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ring_kernel.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

/// By Newton's method on Legendre's polynomials.
template <int N>
GaussRule<N> make_rule() {
    GaussRule<N> rule{};
    for (int i = 0; i < N; ++i) {
        double x = std::cos(pi * (i + 0.75) / (N + 0.5)), slope = 1;
        for (int round = 0; round < 50; ++round) {
            double p = 1, before = 0;
            for (int k = 0; k < N; ++k) {
                const double next = ((2 * k + 1) * x * p - k * before) / (k + 1);
                before = p, p = next;
            }
            slope = N * (x * p - before) / (x * x - 1);
            const double step = p / slope;
            x -= step;
            if (std::fabs(step) < 1e-16) break;
        }
        rule.node[i] = 0.5 * (1 - x);
        rule.weight[i] = 1 / ((1 - x * x) * slope * slope);
    }
    return rule;
}

/// Keeps of [low, high] where a + b c > 0.
void keep_positive(double a, double b, CosineRange& range) {
    if (b > 0)
        range.low = std::max(range.low, -a / b);
    else if (b < 0)
        range.high = std::min(range.high, -a / b);
    else if (!(a > 0))
        range.high = -2;
}

/// Highest cosine at which the line stays inside all bore vertices between.
double highest_cosine(const PlanePoint& from, const PlanePoint& to, const BetweenRings& between) {
    const double rise = to.z - from.z;
    if (rise == 0) return 1.0;
    const double per_rise = 1 / rise, a = from.x * from.x, b = to.x * to.x;
    double least = 2 * from.x * to.x;
    const auto look = [&](const PlanePoint& p) {
        const double t = (p.z - from.z) * per_rise, rest = 1 - t;
        if (t > 1e-9 && rest > 1e-9)
            least = std::min(least, (p.x * p.x - rest * rest * a - t * t * b) / (t * rest));
    };
    for (int k = between.first_bore; k >= 0; k = (*between.next)[k]) {
        look((*between.point)[k]);
        if (k == between.last_bore) break;
    }
    return least / (2 * from.x * to.x);
}

/// Integral over azimuths, given by their cosines c, of (a1 + b1 c) (a2 + b2 c) / (near + f (1 -
/// c))^2.
///
/// With k = 1 + near / f and D = k - c the integrand is (N0 / D^2 - N1 / D + N2) / f^2, N0 to N2
/// the value, slope and curvature of the numerator at c = k, and with t the tangent of half the
/// azimuth the integral of 1 / D is 2 atan(t sqrt((k + 1) / (k - 1))) / sqrt(k^2 - 1), that of 1 /
/// D^2 is (k (integral of 1 / D) + sine / D) / (k^2 - 1). Source: derived here, by differentiation.
class Window {
public:
    Window(double a1, double b1, double a2, double b2, double f, double near)
        : a1_(a1), b1_(b1), a2_(a2), b2_(b2), f_(f), near_(near), over_(near / f) {
        const double one = (a1 + b1) + b1 * over_, two = (a2 + b2) + b2 * over_;
        n0_ = one * two, n1_ = one * b2 + two * b1, n2_ = b1 * b2;
        square_ = over_ * (2 + over_); // k^2 - 1
        root_ = std::sqrt(square_);
        closed_ = over_ > 1e-12 && over_ < 1e3;
    }
    double operator()(double low, double high) const { // of the cosine
        low = std::clamp(low, -1.0, 1.0), high = std::clamp(high, -1.0, 1.0);
        return closed_ ? up_to(low) - up_to(high) : by_points(std::acos(high), std::acos(low));
    }

private:
    double up_to(double c) const {
        const double s = std::sqrt(1 - c), t = std::sqrt(1 + c); // sine and cosine of the half
        const double azimuth = 2 * std::atan2(s, t);
        const double first = 2 / root_ * std::atan2((2 + over_) * s, root_ * t);
        const double second = ((1 + over_) * first + s * t / (over_ + (1 - c))) / square_;
        return (n0_ * second - n1_ * first + n2_ * azimuth) / (f_ * f_);
    }
    /// Where near is much more than f the integrand is smooth; where it vanishes the azimuth is
    /// 2 peak sinh(v), which spreads the peak evenly over v.
    double by_points(double from, double to) const {
        const double peak = std::sqrt(std::max(0.5 * over_, 1e-20));
        const double a = std::asinh(from / (2 * peak)), b = std::asinh(to / (2 * peak));
        const auto by = [&](const auto& rule) {
            double sum = 0;
            for (std::size_t i = 0; i < rule.node.size(); ++i) {
                const double v = std::exp(a + (b - a) * rule.node[i]);
                const double azimuth = peak * (v - 1 / v), half = std::sin(0.5 * azimuth);
                const double c = 1 - 2 * half * half, d = near_ + 2 * f_ * half * half;
                sum += rule.weight[i] * peak * (v + 1 / v) * (a1_ + b1_ * c) * (a2_ + b2_ * c) /
                       (d * d);
            }
            return sum * (b - a);
        };
        return peak > 0.5 ? by(gauss_8()) : by(gauss_16());
    }

    double a1_, b1_, a2_, b2_, f_, near_;
    double over_; ///< near / f
    double n0_, n1_, n2_, square_, root_;
    bool closed_;
};

} // namespace

const GaussRule<8>& gauss_8() {
    static const GaussRule<8> rule = make_rule<8>();
    return rule;
}
const GaussRule<3>& gauss_3() {
    static const GaussRule<3> rule = make_rule<3>();
    return rule;
}
const GaussRule<16>& gauss_16() {
    static const GaussRule<16> rule = make_rule<16>();
    return rule;
}

double disc_exchange(double radius_1, double radius_2, double z) {
    const double a = radius_1 * radius_1, b = radius_2 * radius_2, sum = a + b + z * z;
    // sum^2 - 4 a b without cancellation where the discs are close and equal.
    const double apart = (radius_1 - radius_2) * (radius_1 - radius_2) + z * z;
    const double across = (radius_1 + radius_2) * (radius_1 + radius_2) + z * z;
    return sum > 0 ? 2 * pi * a * b / (sum + std::sqrt(apart * across)) : 0.0;
}

double factor_to_disc(const RingPoint& from, double radius, double z) {
    const double r = from.at.x, b = radius * radius;
    const double apart = (r - radius) * (r - radius) + z * z;
    const double across = (r + radius) * (r + radius) + z * z;
    const double root = std::sqrt(apart * across);
    // 1 - (r^2 + z^2 - R^2) / root, and (r^2 + z^2 + R^2) / root - 1, times 1 / (2 r^2) for the
    // axis, by (p - q) = (p^2 - q^2) / (p + q).
    const double upward = r * r + z * z - b, all = r * r + z * z + b;
    const double horizontal =
        upward > 0 ? 2 * b * z * z / (root * (root + upward)) : 0.5 * (1 - upward / root);
    const double vertical = 2 * r * b * z / (root * (all + root));
    return from.normal.z * horizontal - from.normal.x * vertical;
}

CosineRange crossing(const PlanePoint& from, const PlanePoint& to, const PlanePoint& edge_start,
                     const PlanePoint& edge_end) {
    constexpr CosineRange nothing{2, -2};
    const double rise = to.z - from.z, r1 = from.x, r2 = to.x;
    const double both = 2 * r1 * r2;
    if (!(both > 0)) return nothing;
    double t0 = 0, t1 = 1, radius = edge_start.x, slope = 0; // radius of the edge: radius + slope t
    if (rise != 0) {
        double u0 = (edge_start.z - from.z) / rise, u1 = (edge_end.z - from.z) / rise;
        if (u0 == u1) return nothing; // its neighbours bound what it hides
        slope = (edge_end.x - edge_start.x) / (u1 - u0);
        radius = edge_start.x - slope * u0;
        if (u0 > u1) std::swap(u0, u1);
        t0 = std::max(u0, 0.0), t1 = std::min(u1, 1.0);
    } else {
        const bool below = edge_start.z < from.z;
        if (below == (edge_end.z < from.z)) return nothing;
        radius = edge_start.x + (from.z - edge_start.z) / (edge_end.z - edge_start.z) *
                                    (edge_end.x - edge_start.x);
    }
    constexpr double fine = 1e-9; // the ends themselves touch their own surfaces
    t0 = std::max(t0, fine), t1 = std::min(t1, 1 - fine);
    if (!(t0 < t1)) return nothing;
    // cosine = (n0 + n1 t + n2 t^2) / (both t (1 - t))
    const double n0 = radius * radius - r1 * r1, n1 = 2 * (radius * slope + r1 * r1);
    const double n2 = slope * slope - r1 * r1 - r2 * r2;
    CosineRange range = nothing;
    const auto meet = [&](double t) {
        const double c = (n0 + t * (n1 + t * n2)) / (both * t * (1 - t));
        range.low = std::min(range.low, c);
        range.high = std::max(range.high, c);
    };
    meet(t0);
    meet(t1);
    // Its derivative vanishes where (n1 + n2) t^2 + 2 n0 t - n0 = 0.
    const double quadratic = n1 + n2, root2 = n0 * n0 + quadratic * n0;
    if (root2 >= 0) {
        const double q = -(n0 + std::copysign(std::sqrt(root2), n0));
        if (quadratic != 0 && q / quadratic > t0 && q / quadratic < t1) meet(q / quadratic);
        if (q != 0 && -n0 / q > t0 && -n0 / q < t1) meet(-n0 / q);
    }
    return range;
}

double ring_kernel(const RingPoint& from, const RingPoint& to, const BetweenRings& between,
                   std::vector<CosineRange>& scratch) {
    const double r1 = from.at.x, r2 = to.at.x, rise = to.at.z - from.at.z;
    const double a1 = from.normal.z * rise - from.normal.x * r1, b1 = from.normal.x * r2;
    const double a2 = -to.normal.z * rise - to.normal.x * r2, b2 = to.normal.x * r1;
    CosineRange range{-1, 1};
    keep_positive(a1, b1, range);
    keep_positive(a2, b2, range);
    if (!(range.low < range.high) || !(r1 * r2 > 0)) return 0.0;
    range.high = std::min(range.high, highest_cosine(from.at, to.at, between));
    if (!(range.low < range.high)) return 0.0;
    scratch.clear();
    const double below = std::min(from.at.z, to.at.z), above = std::max(from.at.z, to.at.z);
    for (std::size_t k = between.first_edge; k < between.last_edge; ++k) {
        if (between.is_own(k)) continue;
        const PlanePoint &p = (*between.point)[k], &q = (*between.point)[k + 1];
        if (std::max(p.z, q.z) <= below || std::min(p.z, q.z) >= above) continue;
        const CosineRange hidden = crossing(from.at, to.at, p, q);
        if (hidden.low >= range.high || hidden.high <= range.low || hidden.low > hidden.high)
            continue;
        if (hidden.low <= range.low && hidden.high >= range.high) return 0.0;
        scratch.push_back(hidden);
    }
    std::sort(scratch.begin(), scratch.end(),
              [](const CosineRange& p, const CosineRange& q) { return p.low < q.low; });
    const Window window(a1, b1, a2, b2, 2 * r1 * r2, (r1 - r2) * (r1 - r2) + rise * rise);
    double sum = 0, at = range.low;
    for (const CosineRange& hidden : scratch) {
        if (hidden.low > at) sum += window(at, std::min(hidden.low, range.high));
        at = std::max(at, hidden.high);
    }
    if (at < range.high) sum += window(at, range.high);
    return sum / (pi * pi); // twice over 2 pi, and the cosine law's pi
}

} // namespace rille::fluxes
