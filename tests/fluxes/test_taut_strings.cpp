// SPDX-License-Identifier: Apache-2.0
#include "fluxes/taut_strings.hpp"
#include "tests/support/cavities.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <random>

using namespace rille;
using fluxes::PlanePoint;

namespace {

double cross(const PlanePoint& a, const PlanePoint& b, const PlanePoint& c) {
    return (b.x - a.x) * (c.z - a.z) - (b.z - a.z) * (c.x - a.x);
}
double distance(const PlanePoint& a, const PlanePoint& b) {
    return std::hypot(b.x - a.x, b.z - a.z);
}

/// Whether vertices i and j see each other inside: no edge properly crossed, and the middle of
/// every stretch between touched vertices inside or on the border.
bool sees(const std::vector<PlanePoint>& p, int i, int j) {
    const int n = int(p.size());
    std::vector<double> stops{0, 1};
    const double length = distance(p[i], p[j]), fine = 1e-9 * length * length;
    for (int k = 0; k < n; ++k) {
        const PlanePoint &a = p[k], &b = p[(k + 1) % n];
        const double sa = cross(p[i], p[j], a), sb = cross(p[i], p[j], b);
        if (std::fabs(sa) < fine) {
            const double t =
                ((a.x - p[i].x) * (p[j].x - p[i].x) + (a.z - p[i].z) * (p[j].z - p[i].z)) /
                (length * length);
            if (t > 1e-9 && t < 1 - 1e-9) stops.push_back(t);
        }
        if (sa * sb < 0 && std::fabs(sa) > fine && std::fabs(sb) > fine &&
            cross(a, b, p[i]) * cross(a, b, p[j]) < 0)
            return false;
    }
    std::sort(stops.begin(), stops.end());
    for (std::size_t s = 0; s + 1 < stops.size(); ++s) {
        const double t = 0.5 * (stops[s] + stops[s + 1]);
        const PlanePoint q{p[i].x + t * (p[j].x - p[i].x), p[i].z + t * (p[j].z - p[i].z)};
        bool inside = false, border = false;
        for (int k = 0; k < n; ++k) {
            const PlanePoint &a = p[k], &b = p[(k + 1) % n];
            const double along = ((q.x - a.x) * (b.x - a.x) + (q.z - a.z) * (b.z - a.z)) /
                                 std::pow(distance(a, b), 2);
            border = border || (along >= 0 && along <= 1 &&
                                std::fabs(cross(a, b, q)) < 1e-9 * distance(a, b));
            if ((a.z > q.z) != (b.z > q.z) && q.x < a.x + (q.z - a.z) / (b.z - a.z) * (b.x - a.x))
                inside = !inside;
        }
        if (!inside && !border) return false;
    }
    return true;
}

/// Shortest paths over all pairs that see each other.
std::vector<std::vector<double>> by_visibility(const std::vector<PlanePoint>& p) {
    const int n = int(p.size());
    std::vector<std::vector<double>> d(n, std::vector<double>(n, 1e300));
    for (int i = 0; i < n; ++i) {
        d[i][i] = 0;
        for (int j = 0; j < i; ++j)
            if (sees(p, i, j)) d[i][j] = d[j][i] = distance(p[i], p[j]);
    }
    for (int k = 0; k < n; ++k)
        for (int i = 0; i < n; ++i)
            for (int j = 0; j < n; ++j)
                d[i][j] = std::min(d[i][j], d[i][k] + d[k][j]);
    return d;
}

/// Largest difference between the two ways; `roof` closes the contour.
double largest_difference(const std::vector<PlanePoint>& p) {
    const fluxes::TautStrings strings(p);
    const auto expected = by_visibility(p);
    double worst = 0;
    for (std::size_t i = 0; i < p.size(); ++i) {
        const auto length = strings.lengths(int(i));
        for (std::size_t j = 0; j < p.size(); ++j)
            worst = std::max(worst, std::fabs(length[j] - expected[i][j]));
    }
    return worst;
}

} // namespace

TEST_CASE("taut strings are shortest paths", "[exact]") {
    // Oracle: shortest paths over the graph of vertices that see each other, visibility by brute
    // force.
    // Source: derived here.
    // Tolerance: 1e-9 of lengths up to 100; the straight distance must be missed.
    for (const tests::Cavity& c : tests::all_cavities()) {
        const auto coarse = tests::make_cavity("", c.domain.sides, c.surface.vertices, 4);
        std::vector<PlanePoint> p;
        for (const auto& v : coarse.surface.vertices)
            p.push_back({v.x, v.z});
        p.push_back({p.back().x, 30});
        p.push_back({p.front().x, 30});
        CAPTURE(c.name, p.size());
        CHECK(largest_difference(p) < 1e-9);
        double bent = 0;
        const auto length = fluxes::TautStrings(p).lengths(0);
        for (std::size_t j = 0; j < p.size(); ++j)
            bent = std::max(bent, length[j] - distance(p[0], p[j]));
        CHECK(bent > 1e-2);
    }
    // Spirals and combs of random depth: strings bend to both sides many times.
    std::mt19937 random(5);
    std::uniform_real_distribution<double> u(0, 1);
    for (int trial = 0; trial < 5; ++trial) {
        std::vector<PlanePoint> p{{0, 20}, {0, 0}};
        for (int k = 0; k < 6; ++k) {
            const double x = 2 + 3 * k + u(random), tip = 6 + 12 * u(random);
            p.insert(p.end(), {{x, u(random)},
                               {x - 1.5 * u(random), tip},
                               {x + 0.5, tip + u(random)},
                               {x + 1, 0}});
        }
        p.push_back({22, 0});
        p.push_back({22, 20});
        for (int k = 5; k >= 0; --k) {
            const double x = 4 + 3 * k;
            p.insert(p.end(), {{x + 0.2, 20}, {x, 20 - 4 * u(random)}, {x - 0.2, 20}});
        }
        CHECK(largest_difference(p) < 1e-9);
    }
}

TEST_CASE("taut strings refuse a boundary that crosses itself", "[exact]") {
    // Oracle: no inside, no string.
    // Source: derived here.
    // Tolerance: exact.
    CHECK_THROWS(fluxes::TautStrings({{0, 0}, {2, 2}, {2, 0}, {0, 2}, {-1, 1.5}, {3, 1.4}}));
}
