// SPDX-License-Identifier: Apache-2.0
#include "engine/simulation.hpp"
#include "geometry/check.hpp"
#include "tests/support/random_rays.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using engine::Health;
using geometry::Domain;
using geometry::RayCaster;
using geometry::Surface;

namespace {

Domain period() {
    Domain domain;
    domain.cells_x = 100;
    return domain;
}

/// The surface without one of its elements.
Surface holed(Surface s, int element) {
    s.corners.erase(s.corners.begin() + element);
    s.normal.erase(s.normal.begin() + element);
    s.centre.erase(s.centre.begin() + element);
    s.area.erase(s.area.begin() + element);
    s.chain.pop_back();
    s.next.pop_back();
    s.previous.pop_back();
    s.next.back() = -1;
    return s;
}

/// Counters of a run that traces this many rays down from the mouth of the trench.
Health traced(const Surface& surface, int rays) {
    const RayCaster caster(period(), surface, 2.0);
    for (int ray = 0; ray < rays; ++ray)
        caster.trace({0, 0, -5},
                     tests::cosine_direction({0, 0, -1}, tests::uniform(1, 2 * ray),
                                             tests::uniform(1, 2 * ray + 1)),
                     -1);
    Health health;
    health.rays = caster.traced();
    health.lost_rays = caster.lost();
    return health;
}

} // namespace

// Oracle: a closed surface loses no ray; through a gap of one element in the floor many are lost.
// Source: definition. Tolerance: none lost; the surface with the gap must stop the run.
TEST_CASE("a run that loses rays stops", "[lost rays]") {
    const Surface whole = tests::trench(period(), 40, 40, 1.0);
    const Health good = traced(whole, 20000);
    CHECK(good.lost_rays == 0);
    CHECK_NOTHROW(engine::check_lost_rays(good));
    const Health faulty = traced(holed(whole, 90), 20000);
    CHECK(faulty.lost_rays > 200);
    CHECK_THROWS_WITH(engine::check_lost_rays(faulty),
                      Catch::Contains(std::to_string(faulty.lost_rays) + " of 20000 rays"));
    CHECK_THROWS_AS(engine::check_lost_rays(faulty), NumericsError);
}

TEST_CASE("a few lost rays among very many do not stop a run", "[lost rays]") {
    Health health;
    health.rays = 20000000;
    health.lost_rays = 200;
    CHECK_NOTHROW(engine::check_lost_rays(health));
    health.lost_rays = 201;
    CHECK_THROWS_AS(engine::check_lost_rays(health), NumericsError);
    health.rays = 1000;
    health.lost_rays = 100;
    CHECK_NOTHROW(engine::check_lost_rays(health));
}
