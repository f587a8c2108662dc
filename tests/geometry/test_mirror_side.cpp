// SPDX-License-Identifier: Apache-2.0
#include "geometry/mirror_side.hpp"
#include "tests/support/make_band.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <functional>
#include <random>
#include <vector>

using namespace rille::geometry;
using rille::tests::make_band;

namespace {

constexpr double h = 2.0;

/// phi on the lower or upper side along `axis` where phi = f(distance to that side) + z, less z.
double on_side(const std::function<double(double)>& f, int axis = 0, bool low = true) {
    Domain d;
    d.symmetry = Symmetry::full;
    d.spacing = h;
    d.cells_x = d.cells_y = 8;
    const double edge = 4 * h;
    const auto phi = [&](const Vec3& p) {
        const double at = axis == 0 ? p.x : p.y;
        return f(low ? at + edge : edge - at) + p.z;
    };
    const Band band = make_band(d, phi, -20, 20);
    for (std::size_t c = 0; c < band.size(); ++c) {
        const Band::Cell& cell = band.cells[c];
        const int place = axis == 0 ? cell.i : cell.j;
        if (place != (low ? 0 : 7) || cell.k != 0) continue;
        return band.phi[c] + change_to_side(band, static_cast<int>(c), axis, low) -
               d.node(cell.i, cell.j, cell.k).z;
    }
    FAIL("no node beside the side");
    return 0;
}

} // namespace

// Oracle: the function itself.
// Source: a parabola through two values on either side of its axis; a line through two values.
// Tolerance: 1e-12 nm; a straight flank taken for even would be off by 3/8 of its fall per cell.
TEST_CASE("values on mirror sides") {
    for (const int axis : {0, 1})
        for (const bool low : {true, false}) {
            CAPTURE(axis, low);
            for (const double bend : {-0.1, -0.004, 0.0, 0.02, 0.1})
                CHECK(on_side([&](double x) { return 0.3 + 0.5 * bend * x * x; }, axis, low) ==
                      Approx(0.3).margin(1e-12));
            for (const double slope : {-0.9, -0.1, 0.1, 0.2, 0.5, 1.0})
                CHECK(on_side([&](double x) { return -0.2 + slope * x; }, axis, low) ==
                      Approx(-0.2).margin(1e-12));
        }
}

// Oracle: the order, from halved curvatures. Source: Taylor series of an even function: what the
// parabola leaves is of fourth order in the distance over the radius.
TEST_CASE("values on mirror sides where phi is round") {
    const auto error = [](double radius) { // phi itself, not a height: a ball about the side
        return std::fabs(on_side([&](double x) { return std::hypot(x, radius) - radius; }));
    };
    for (const double radius : {6.0, 12.0, 24.0}) {
        CAPTURE(radius);
        CHECK(error(radius) < 0.05 * h);
        CHECK(error(2 * radius) < error(radius) / 6);
    }
}

// Oracle: the rms of the results over that of independent errors at the nodes.
// Source: weights 9/8 and -1/8 of a parabola about the side: their root sum of squares is 1.13.
// Tolerance: 2 % of 4000 draws on a bent surface, which a third node would double; on a level one
// that errors alone bend the same.
TEST_CASE("noise of values on mirror sides") {
    std::mt19937 random(7);
    std::normal_distribution<double> draw(0, 1e-3);
    for (const double bend : {0.0, 0.06}) {
        double sum = 0;
        const int draws = 4000;
        for (int n = 0; n < draws; ++n) {
            double error[8];
            for (double& e : error)
                e = draw(random);
            const auto noisy = [&](double x) {
                return 0.5 * bend * x * x + error[std::clamp(int(x / h), 0, 7)];
            };
            sum += std::pow(on_side(noisy), 2);
        }
        CAPTURE(bend);
        CHECK(std::sqrt(sum / draws) == Approx(1.132e-3).epsilon(0.02));
    }
}
