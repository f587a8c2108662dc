// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"
#include "geometry/normals_nearby.hpp"
#include "tests/support/one_ion.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Surface;
using tests::OneIon;
using tests::pi;

namespace {

constexpr double period = 48; // of the valley, 12 deep

/// The contour of a valley at x = 0, or of the half of it from the bottom to the ridge.
Surface valley(Domain& d, bool half) {
    d.spacing = 1;
    d.cells_x = int(half ? period / 2 : period);
    const double shift = half ? period / 4 : 0; // the bottom lies at the left side
    std::vector<Vec3> points;
    for (int i = 0; i <= d.cells_x; ++i) {
        const double x = i - 0.5 * d.cells_x;
        points.push_back({x, 0, -6 * (1 + std::cos(2 * pi * (x + shift) / period))});
    }
    return tests::polyline(d, points, 10);
}

/// A trench with a bottom of two faces, each `across` wide and leaning by `slope`, in the middle or
/// halved.
Surface pointed_trench(Domain& d, bool half, double across, double slope) {
    d.spacing = 1;
    d.cells_x = half ? 24 : 48;
    const double left = -0.5 * d.cells_x, right = 0.5 * d.cells_x, middle = half ? left : 0;
    std::vector<Vec3> points = {{middle, 0, -20.0 + slope * across},
                                {middle + across, 0, -20},
                                {middle + across, 0, 0},
                                {right, 0, 0}};
    if (!half) points.insert(points.begin(), {{left, 0, 0}, {-across, 0, 0}, {-across, 0, -20}});
    return tests::polyline(d, points, 1);
}

/// Normals, and tallies at the own normal and at turned ones, of the right half of a shape that is
/// its own mirror image about x = 0 and of that half between mirrors.
void compare_halves(const Domain& whole_domain, const Surface& whole, const Domain& half_domain,
                    const Surface& half) {
    const std::size_t n = half.size();
    REQUIRE(whole.size() == 2 * n);
    const auto law = IonDistribution::thermal_fall(20, 0.5, 0.5);
    const YieldFunction grazing{ConstantLaw{1.0}, PlateauCosine{45}, 1.0};
    const OneIon a(whole_domain, whole, law, 1, grazing), b(half_domain, half, law, 1, grazing);
    const DirectIons &all = a.ions, &part = b.ions;
    for (std::size_t e = 0; e < n; ++e) {
        const int twin = int(n + e);
        INFO("element " << e << " at " << whole.centre[twin].x);
        CHECK((all.normal()[twin] - part.normal()[e]).length() < 1e-12);
        CHECK(part.flux(0, int(e)) == Approx(all.flux(0, twin)).epsilon(1e-9));
        CHECK(b.ions.tally(0, int(e)) == Approx(a.ions.tally(0, twin)).epsilon(1e-6));
        for (const double turned : {-0.9, -0.2, 0.0, 0.3, 1.2})
            CHECK(b.ions.tally_at(0, int(e), turned) ==
                  Approx(a.ions.tally_at(0, twin, turned)).epsilon(1e-6).margin(1e-9));
    }
}

} // namespace

TEST_CASE("half a shape between mirrors receives what the whole one does", "[direct]") {
    // Oracle: the mirror image. Tolerance: round-off, 1e-6 for rows kept as float. Without images
    // the normals beside the sides lean by the slope half a window further on.
    Domain whole, half;
    SECTION("a valley") {
        const Surface of_whole = valley(whole, false), of_half = valley(half, true);
        CHECK(std::fabs(of_half.normal[0].x) > 1e-3);
        compare_halves(whole, of_whole, half, of_half);
    }
    SECTION("pieces shorter and longer than the window, and than half of it") {
        for (const double across : {1.0, 2.0, 3.0, 4.0, 8.0}) {
            const Surface of_whole = pointed_trench(whole, false, across, 0.2),
                          of_half = pointed_trench(half, true, across, 0.2);
            compare_halves(whole, of_whole, half, of_half);
        }
    }
    SECTION("a ridge so sharp that it is a corner") { // 22 to 53 deg of slope: 44 to 106 of turn
        for (const double slope : {0.4, 0.8, 1.3}) {
            const Surface of_whole = pointed_trench(whole, false, 8, slope),
                          of_half = pointed_trench(half, true, 8, slope);
            compare_halves(whole, of_whole, half, of_half);
        }
    }
}

TEST_CASE("normals nearby", "[direct]") {
    // Oracle: every pair of elements compared, and the definition beside the sides.
    Domain d;
    const Surface s = valley(d, false);
    const auto range = geometry::normals_nearby(d, s, 4);
    for (std::size_t e = 0; e < s.size(); ++e) {
        const double x = s.centre[e].x;
        if (std::fabs(x) > 20) {
            CHECK(range[e].low == -pi);
            CHECK(range[e].high == pi);
            continue;
        }
        double low = pi, high = -pi;
        for (std::size_t f = 0; f < s.size(); ++f)
            if ((s.centre[f] - s.centre[e]).length() <= 4) {
                const double psi = std::atan2(s.normal[f].x, s.normal[f].z);
                low = std::min(low, psi);
                high = std::max(high, psi);
            }
        CHECK(range[e].low == Approx(low).margin(1e-12));
        CHECK(range[e].high == Approx(high).margin(1e-12));
    }
}
