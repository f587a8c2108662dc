// SPDX-License-Identifier: Apache-2.0
#include "geometry/opening_outlines.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

double ellipse_distance(double x, double y, double a, double b) {
    if (a < b) {
        std::swap(a, b);
        std::swap(x, y);
    }
    const double aa = a * a, bb = b * b;
    const bool inside = x * x / aa + y * y / bb < 1;
    double foot_x, foot_y;
    if (y <= 1e-14 * b && x < (aa - bb) / a) { // on the long axis between the evolute's cusps
        foot_x = aa * x / (aa - bb);
        foot_y = b * std::sqrt(std::max(0.0, 1 - foot_x * foot_x / aa));
    } else {
        // The foot is (a^2 x / (t + a^2), b^2 y / (t + b^2)) with t the largest root of a convex,
        // falling function: Newton's iteration from its left never overshoots.
        double t = std::max(-bb + b * y, -aa + a * x);
        for (int n = 0; n < 100; ++n) {
            const double u = a * x / (t + aa), v = y > 0 ? b * y / (t + bb) : 0;
            const double slope = -2 * (u * u / (t + aa) + (y > 0 ? v * v / (t + bb) : 0));
            if (!(slope < 0)) break;
            const double step = -(u * u + v * v - 1) / slope;
            t += step;
            if (std::fabs(step) <= 1e-15 * aa) break;
        }
        foot_x = aa * x / (t + aa);
        foot_y = y > 0 ? bb * y / (t + bb) : 0;
    }
    const double distance = std::hypot(x - foot_x, y - foot_y);
    return inside ? -distance : distance;
}

OpeningOutlines::OpeningOutlines(const Domain& domain, const std::vector<Opening>& openings)
    : domain_(domain) {
    const bool mirror = domain.sides == Sides::mirror;
    const auto images = [&](double c, double width) {
        if (domain.revolved()) return std::vector<double>{c};
        if (mirror) return std::vector<double>{c, -width - c, width - c};
        return std::vector<double>{c, c - width, c + width};
    };
    std::vector<std::pair<double, double>> trenches;
    for (const Opening& o : openings)
        for (const double x : images(o.centre_x, domain.width_x())) {
            const double a = 0.5 * o.width_x;
            if (o.shape == Opening::Shape::trench) {
                trenches.push_back({x - a, x + a});
                continue;
            }
            const double b = o.shape == Opening::Shape::round ? a : 0.5 * o.width_y;
            for (const double y : images(o.centre_y, domain.width_y()))
                vias_.push_back({x, y, a, b, std::max(a, b)});
        }
    std::sort(trenches.begin(), trenches.end());
    for (const auto& [from, to] : trenches)
        add_trench(from, to);
}

void OpeningOutlines::add_trench(double from, double to) {
    if (!edges_.empty() && from <= edges_.back()) {
        edges_.back() = std::max(edges_.back(), to);
    } else {
        edges_.push_back(from);
        edges_.push_back(to);
    }
}

double OpeningOutlines::fold(double v, double low, double width) const {
    if (v >= low && v <= low + width) return v;
    double u = (v - low) / width;
    if (domain_.sides == Sides::periodic) return low + width * (u - std::floor(u));
    u -= 2 * std::floor(0.5 * u); // [0, 2)
    return low + width * (u > 1 ? 2 - u : u);
}

double OpeningOutlines::distance(double x, double y) const {
    x = fold(x, domain_.x_min(), domain_.width_x());
    y = fold(y, domain_.y_min(), domain_.width_y());
    double best = 1e30;
    if (!edges_.empty()) {
        const auto above = std::upper_bound(edges_.begin(), edges_.end(), x);
        if (above != edges_.end()) best = *above - x;
        if (above != edges_.begin()) best = std::min(best, x - *(above - 1));
        if ((above - edges_.begin()) % 2 == 1) best = -best;
    }
    for (const Via& v : vias_) {
        const double dx = std::fabs(x - v.x), dy = std::fabs(y - v.y);
        const double nearest = best + v.largest; // it must come closer than this to matter
        if (nearest <= 0 || dx * dx + dy * dy >= nearest * nearest) continue;
        best = std::min(best, v.a == v.b ? std::sqrt(dx * dx + dy * dy) - v.a
                                         : ellipse_distance(dx, dy, v.a, v.b));
    }
    return best;
}

} // namespace rille::geometry
