// SPDX-License-Identifier: Apache-2.0
#include "geometry/nearest.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <random>

using namespace rille;
using geometry::Vec3;

// Oracle: brute force over all elements and their images beyond the sides.
// Source: definition.
// Tolerance: exact distance to 1e-12.
TEST_CASE("the nearest element agrees with brute force, images included", "[nearest]") {
    const auto sides = GENERATE(geometry::Sides::mirror, geometry::Sides::periodic);
    geometry::Domain domain;
    domain.sides = sides;
    domain.spacing = 2;
    domain.cells_x = 30;
    const auto surface = tests::trench(domain, 20, 50, 1.7);
    const geometry::NearestElement nearest(domain, surface);
    std::mt19937 random(3);
    std::uniform_real_distribution<double> x(-34, 34), z(-60, 15);
    for (int n = 0; n < 500; ++n) {
        const Vec3 p(x(random), 0, z(random));
        double best = 1e300;
        for (const Vec3& c : surface.centre)
            for (int image = -1; image <= 1; ++image) {
                const double shifted = sides == geometry::Sides::periodic
                                           ? c.x + image * domain.width_x()
                                           : (image == 0 ? c.x : image * domain.width_x() - c.x);
                best = std::min(best, std::hypot(p.x - shifted, p.z - c.z));
            }
        const int found = nearest(p);
        REQUIRE(found >= 0);
        double distance = 1e300;
        for (int image = -1; image <= 1; ++image) {
            const double c = surface.centre[found].x;
            const double shifted = sides == geometry::Sides::periodic
                                       ? c + image * domain.width_x()
                                       : (image == 0 ? c : image * domain.width_x() - c);
            distance = std::min(distance, std::hypot(p.x - shifted, p.z - surface.centre[found].z));
        }
        CHECK(distance == Approx(best).margin(1e-12));
    }
}
