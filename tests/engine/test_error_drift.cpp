// SPDX-License-Identifier: Apache-2.0
#include "engine/error_drift.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using geometry::Vec3;

namespace {

/// A floor of `n` segments of 1 nm along x and a wall of 10 up at its end.
geometry::Surface floor_and_wall(int n) {
    geometry::Surface s;
    for (int i = 0; i <= n; ++i)
        s.vertices.emplace_back(i, 0, 0);
    for (int k = 1; k <= 10; ++k)
        s.vertices.emplace_back(n, 0, k);
    const int size = n + 10;
    for (int e = 0; e < size; ++e) {
        s.corners.push_back({e, e + 1, -1, -1});
        s.centre.push_back((s.vertices[e] + s.vertices[e + 1]) * 0.5);
        s.normal.push_back(e < n ? Vec3(0, 0, 1) : Vec3(-1, 0, 0));
        s.area.push_back(1);
        s.previous.push_back(e - 1);
        s.next.push_back(e + 1 < size ? e + 1 : -1);
        s.chain.push_back(0);
    }
    return s;
}

/// R = 1 + slope * psi for all elements.
geometry::NormalRates tilted(std::size_t elements, double slope) {
    geometry::NormalRates rates;
    rates.angles = {-3.2, -0.5, 0.5, 3.2};
    for (std::size_t e = 0; e < elements; ++e) {
        rates.first_row.push_back(static_cast<int>(e));
        rates.material.push_back(0);
        for (const double psi : rates.angles)
            rates.table.push_back(1 + slope * psi);
    }
    rates.first_row.push_back(static_cast<int>(elements));
    return rates;
}

double bump(double x, double at) {
    return std::exp(-0.5 * std::pow((x - at) / 4, 2));
}

} // namespace

// Oracle: an error of displacement moves along the contour with -dR/dpsi and keeps its form.
// Source: linear perturbation of a front that moves with R(psi), derived here.
// Tolerance: 10 steps of 0.73 elements: 0.02 of the height of a bump of 4 elements' standard
// deviation; one that stays, or goes the other way, must fail.
TEST_CASE("errors of displacement drift along the contour", "[engine][errors]") {
    const int n = 60;
    const geometry::Surface s = floor_and_wall(n);
    for (const double slope : {0.73, -0.73}) {
        std::vector<std::vector<double>> fields{std::vector<double>(s.size(), 0)};
        std::vector<double>& error = fields[0];
        for (int e = 0; e < n; ++e)
            error[e] = bump(s.centre[e].x, 30);
        for (int step = 0; step < 10; ++step)
            engine::drift_along_contour(s, tilted(s.size(), slope), 1, fields);
        double moved = 0, stayed = 0, back = 0;
        for (int e = 0; e < n; ++e) {
            moved = std::max(moved, std::fabs(error[e] - bump(s.centre[e].x, 30 - 10 * slope)));
            stayed = std::max(stayed, std::fabs(error[e] - bump(s.centre[e].x, 30)));
            back = std::max(back, std::fabs(error[e] - bump(s.centre[e].x, 30 + 10 * slope)));
        }
        CAPTURE(slope, moved);
        CHECK(moved < 0.02);
        CHECK(stayed > 0.02);
        CHECK(back > 0.02);
    }
}

// Oracle: nothing of a floor gets onto the wall, and a long way ends at the corner.
// Source: definition. Tolerance: none.
TEST_CASE("errors of displacement do not drift round corners", "[engine][errors]") {
    const int n = 20;
    const geometry::Surface s = floor_and_wall(n);
    std::vector<std::vector<double>> fields{std::vector<double>(s.size(), 0)};
    std::vector<double>& error = fields[0];
    for (int e = 0; e < n; ++e)
        error[e] = 1 + e;
    engine::drift_along_contour(s, tilted(s.size(), -100), 1, fields); // from far behind
    for (int e = 0; e < n; ++e)
        CHECK(error[e] == 1);
    for (int e = n; e < n + 10; ++e)
        CHECK(error[e] == 0);
}
