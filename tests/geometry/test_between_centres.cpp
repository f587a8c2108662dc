// SPDX-License-Identifier: Apache-2.0
#include "geometry/between_centres.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

using namespace rille::geometry;

// Oracle: a field that is linear along a floor and another along a wall is found again at every
// place of both, up to the corner between them: nothing of the other side comes in, and the last
// half element is no step.
// Source: definition of linear interpolation.
// Tolerance: 1e-12; the value of the nearest centre alone must be off by a tenth.
TEST_CASE("values between element centres reach as far as the corner") {
    Domain d;
    d.cells_x = 60;
    Surface s =
        rille::tests::polyline(d, {{-30, 0, 0}, {3.7, 0, 0}, {3.7, 0, 25}, {30, 0, 25}}, 1.3);
    const auto on_floor = [](const Vec3& p) { return p.z < 1e-9; };
    const auto on_wall = [](const Vec3& p) { return p.x > 3.6 && p.x < 3.8; };
    const auto field = [&](const Vec3& p) {
        return on_floor(p) ? 50 + p.x : on_wall(p) ? 200 - 2 * p.z : 7;
    };
    double most = 0;
    int places = 0;
    for (int e = 0; e < static_cast<int>(s.size()); ++e) {
        if (!on_floor(s.centre[e]) && !on_wall(s.centre[e])) continue;
        const Vec3 &a = s.vertices[s.corners[e][0]], &b = s.vertices[s.corners[e][1]];
        for (const double part : {0.0, 0.2, 0.5, 0.9, 1.0}) {
            const Vec3 foot = a + (b - a) * part;
            const BetweenCentres at = between_centres(d, s, e, foot);
            REQUIRE(at.element == e);
            if (at.partner < 0) continue; // the only element of its piece
            const double own = field(s.centre[e]);
            const double found = value_between(own, field(s.centre[at.partner]), at.share);
            const double exact = on_floor(s.centre[e]) ? 50 + foot.x : 200 - 2 * foot.z;
            INFO("element " << e << " at " << foot.x << ", " << foot.z);
            CHECK(found == Approx(exact).epsilon(1e-12));
            most = std::max(most, std::fabs(own - exact));
            ++places;
        }
    }
    CHECK(places > 150);
    CHECK(most > 0.1);
}

// Oracle: the definition: what is extrapolated changes by no more than the value it starts from.
TEST_CASE("extrapolated values keep their sign") {
    CHECK(value_between(1, 3, 0.5) == 2);
    CHECK(value_between(1, 3, -0.25) == 0.5);
    CHECK(value_between(1, 9, -0.5) == 0);
    CHECK(value_between(-1, -9, -0.5) == 0);
    CHECK(value_between(1, -9, -0.5) == 2);
    CHECK(value_between(0, 5, -0.5) == 0);
}

// Oracle: a field that is even about a mirror side does not change between the last centre and its
// image; a slope that meets its image in an edge has a field of its own up to the edge.
// Source: definition of a mirror. Tolerance: exact; 1e-12.
TEST_CASE("values between the last centre and a mirror side") {
    Domain d;
    d.cells_x = 60;
    for (const bool level : {true, false})
        for (const double side : {-1.0, 1.0}) {
            CAPTURE(level, side);
            const double rise = level ? 2 : 20;
            const Surface s = rille::tests::polyline(d, {{-30, 0, 0}, {0, 0, rise}, {30, 0, 0}}, 3);
            const int last = side < 0 ? 0 : static_cast<int>(s.size()) - 1;
            const Vec3 end = s.vertices[s.corners[last][side < 0 ? 0 : 1]];
            REQUIRE(std::fabs(end.x) == 30);
            const BetweenCentres at = between_centres(d, s, last, end);
            CHECK(at.element == last);
            CHECK((at.partner < 0) == level);
            if (level) continue;
            const auto field = [](const Vec3& p) { return 50 - std::fabs(p.x); };
            const double own = field(s.centre[last]);
            CHECK(value_between(own, field(s.centre[at.partner]), at.share) ==
                  Approx(field(end)).epsilon(1e-12));
        }
}
