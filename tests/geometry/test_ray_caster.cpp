// SPDX-License-Identifier: Apache-2.0
#include "geometry/ray_caster.hpp"
#include "tests/support/random_rays.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

Domain period(Symmetry symmetry, Sides sides, int cells, double spacing) {
    Domain d;
    d.symmetry = symmetry;
    d.sides = sides;
    d.spacing = spacing;
    d.cells_x = cells;
    d.cells_y = symmetry == Symmetry::full ? cells : 1;
    return d;
}

/// A wavy surface with overhangs: a polygon whose points lean to either side.
Surface wavy(const Domain& domain, std::uint64_t seed, int waves) {
    const double half = 0.5 * domain.width_x(), step = domain.width_x() / waves;
    const double end = -8 * uniform(seed, 1);
    std::vector<Vec3> points{{-half, 0, end}};
    for (int i = 0; i < waves; ++i) {
        const double x = -half + (i + 0.5) * step, lean = 0.9 * (uniform(seed, 4 * i + 10) - 0.5);
        const double depth = -10 - 30 * uniform(seed, 4 * i + 11);
        points.push_back({x - 0.1 * step, 0, -4 * uniform(seed, 4 * i + 12)});
        points.push_back({x - 0.1 * step + lean * step * 0.8, 0, depth});
        points.push_back({x + 0.1 * step + lean * step * 0.8, 0, depth});
        points.push_back({x + 0.1 * step, 0, -4 * uniform(seed, 4 * i + 13)});
    }
    points.push_back({half, 0, end});
    return polyline(domain, points, 1.0);
}

/// A trench whose walls have slits, lower than a cell and tilted at random, one above the other.
Surface slitted(const Domain& domain, std::uint64_t seed) {
    const double half = 0.5 * domain.width_x(), wall = 8;
    std::vector<Vec3> points{{-half, 0, 0}, {-wall, 0, 0}};
    double z = -1;
    std::uint64_t n = 0;
    const auto any = [&](double low, double high) {
        return low + (high - low) * uniform(seed, ++n);
    };
    std::vector<Vec3> right;
    for (; z > -30; z -= any(1.5, 4)) {
        const double height = any(0.02, 1.4), deep = any(0.5, 12), tilt = any(-0.1, 0.1) * deep;
        points.insert(points.end(), {{-wall, 0, z},
                                     {-wall - deep, 0, z + tilt},
                                     {-wall - deep, 0, z + tilt - height * any(0.1, 1)},
                                     {-wall, 0, z - height}});
        right.insert(right.end(), {{wall, 0, z},
                                   {wall + deep, 0, z + tilt},
                                   {wall + 1.05 * deep, 0, z + tilt - 0.5 * height},
                                   {wall, 0, z - height}});
    }
    points.insert(points.end(), {{-wall, 0, -40}, {any(-2, 2), 0, any(-44, -40)}, {wall, 0, -40}});
    points.insert(points.end(), right.rbegin(), right.rend());
    points.insert(points.end(), {{wall, 0, 0}, {half, 0, 0}});
    return polyline(domain, points, any(0.4, 3));
}

struct Crossing {
    double t = 1e300;
    int element = -1;
};

/// First crossing by trying every segment of explicit images -3..3 in long double.
Crossing brute_force(const Domain& domain, const Surface& s, const Vec3& o, const Vec3& d,
                     int from) {
    Crossing best;
    for (int image = -3; image <= 3; ++image)
        for (int e = 0; e < static_cast<int>(s.size()); ++e) {
            const bool turn = domain.sides == Sides::mirror && image % 2 != 0;
            if (e == from && image == 0) continue;
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const long double shift = image * static_cast<long double>(domain.width_x());
            const long double ax = shift + (turn ? -a.x : a.x) - o.x, az = a.z - o.z;
            const long double bx = shift + (turn ? -b.x : b.x) - o.x, bz = b.z - o.z;
            const long double side_a = d.x * az - d.z * ax, side_b = d.x * bz - d.z * bx;
            if ((side_a < 0) == (side_b < 0)) continue;
            const long double plane = static_cast<long double>(d.x) * d.x + d.z * d.z;
            const long double ta = (d.x * ax + d.z * az) / plane,
                              tb = (d.x * bx + d.z * bz) / plane;
            const long double t = ta + (tb - ta) * side_a / (side_a - side_b);
            if (t > 1e-9 && t < best.t) best = {static_cast<double>(t), e};
        }
    return best;
}

} // namespace

TEST_CASE("extruded rays against brute force over explicit images", "[rays]") {
    // Oracle: every segment of seven explicit images tried in long double.
    // Source: derived here.
    // Tolerance: distance 1e-9 of the period; the element agrees unless the hit is at a vertex.
    for (const Sides sides : {Sides::mirror, Sides::periodic})
        for (std::uint64_t seed = 1; seed <= 6; ++seed) {
            const Domain domain = period(Symmetry::extruded, sides, 100, 1.0);
            const Surface s = wavy(domain, seed, 1 + static_cast<int>(seed) % 4);
            const RayCaster caster(domain, s, 2.0);
            int wrong = 0, hits = 0;
            for (int ray = 0; ray < 4000; ++ray) {
                const int e = static_cast<int>(uniform(seed, 10 * ray + 1000) * s.size());
                const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
                const Vec3 o = a + (b - a) * (0.01 + 0.98 * uniform(seed, 10 * ray + 1001));
                const Vec3 d = cosine_direction(s.normal[e], uniform(seed, 10 * ray + 1002),
                                                uniform(seed, 10 * ray + 1003));
                const Hit hit = caster.trace(o, d, e);
                const Crossing wanted = brute_force(domain, s, o, d, e);
                const bool open = wanted.element < 0;
                if (open != (hit.kind == Hit::Kind::open)) ++wrong;
                if (open || hit.kind != Hit::Kind::surface) continue;
                ++hits;
                if (std::fabs(hit.distance - wanted.t) > 1e-7) ++wrong;
                if (hit.element != wanted.element && std::abs(hit.element - wanted.element) != 1)
                    ++wrong;
                if (std::fabs(hit.direction.length() - 1) > 1e-12) ++wrong;
                if (hit.direction.dot(s.normal[hit.element]) > 0) ++wrong;
            }
            CHECK(wrong == 0);
            CHECK(hits > 500);
            CHECK(caster.lost() == 0);
        }
}

TEST_CASE("extruded rays between surfaces less than a cell apart", "[rays]") {
    // Oracle: every segment of seven explicit images tried in long double.
    // Source: derived here.
    // Tolerance: as above.
    int hits = 0;
    for (std::uint64_t seed = 1; seed <= 12; ++seed) {
        const Sides sides = seed % 2 ? Sides::mirror : Sides::periodic;
        const Domain domain = period(Symmetry::extruded, sides, 60, 1.0);
        const Surface s = slitted(domain, seed);
        const RayCaster caster(domain, s, 2.0);
        int wrong = 0;
        for (int ray = 0; ray < 4000; ++ray) {
            const int e = static_cast<int>(uniform(seed, 10 * ray + 1000) * s.size());
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const Vec3 o = a + (b - a) * (0.01 + 0.98 * uniform(seed, 10 * ray + 1001));
            const Vec3 d = cosine_direction(s.normal[e], uniform(seed, 10 * ray + 1002),
                                            uniform(seed, 10 * ray + 1003));
            const Hit hit = caster.trace(o, d, e);
            const Crossing wanted = brute_force(domain, s, o, d, e);
            wrong += (wanted.element < 0) != (hit.kind == Hit::Kind::open);
            if (wanted.element < 0 || hit.kind != Hit::Kind::surface) continue;
            ++hits;
            wrong += std::fabs(hit.distance - wanted.t) > 1e-7;
            wrong += std::abs(hit.element - wanted.element) > 1;
        }
        CHECK(wrong == 0);
        CHECK(caster.lost() == 0);
    }
    CHECK(hits > 30000);
}

TEST_CASE("extruded rays hit where geometry says", "[rays]") {
    // Oracle: straight lines in a trench of width 40 and depth 100, worked out by hand.
    // Source: derived here.
    // Tolerance: 1e-12 of the period.
    const Domain domain = period(Symmetry::extruded, Sides::mirror, 100, 1.0);
    const Surface s = trench(domain, 40, 100, 1.0);
    const RayCaster caster(domain, s, 2.0);
    const auto near = [](double v) { return Approx(v).margin(1e-10); };

    SECTION("a slanted ray with a part along y meets the other wall") {
        const Hit hit = caster.trace({-20, 0, -95.5}, Vec3(6, 3, 2) / 7.0, -1);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.distance == near(40 * 7 / 6.0));
        CHECK(hit.point.x == near(20));
        CHECK(hit.point.y == near(20));
        CHECK(hit.point.z == near(-95.5 + 40.0 / 3));
        CHECK(s.normal[hit.element].x == near(-1));
    }
    SECTION("straight down the middle, at a vertex of the floor") {
        const Hit hit = caster.trace({0, 0, 1}, {0, 0, -1}, -1);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.distance == near(101));
        CHECK(hit.point.z == near(-100));
    }
    SECTION("level across, at the height of vertices") {
        const Hit hit = caster.trace({-20, 0, -50}, {1, 0, 0}, -1);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.distance == near(40));
    }
    SECTION("straight down along either side of the period") {
        for (const double x : {-50.0, 50.0}) {
            const Hit hit = caster.trace({x, 0, 1}, {0, 0, -1}, -1);
            REQUIRE(hit.kind == Hit::Kind::surface);
            CHECK(hit.distance == near(1));
        }
    }
    SECTION("from far above, folded many times at the sides") {
        // 2,000 along x while it falls 500: from x = 30 it would land at x = 2,030 = 20 periods
        // + 30.
        const Hit hit = caster.trace({30, 0, 500}, Vec3(4, 0, -1).normalized(), -1);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.distance == near(500 * std::sqrt(17.0)));
        CHECK(hit.point.x == near(30));
        CHECK(hit.direction.x > 0);
    }
    SECTION("an odd number of mirrors turns the ray round") {
        const Hit hit = caster.trace({30, 0, 25}, Vec3(4, 0, -1).normalized(), -1);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.point.x == near(-30)); // 130 lies in the first image
        CHECK(hit.direction.x < 0);
    }
    SECTION("out into the open") {
        const Hit hit = caster.trace({0, 0, -100}, {0, 0, 1}, -1);
        CHECK(hit.kind == Hit::Kind::open);
        CHECK(hit.distance == near(102));
        CHECK(hit.point.z == near(2));
        CHECK(caster.trace({0, 0, 50}, {1, 0, 0}, -1).kind == Hit::Kind::lost);
    }
    SECTION("along y there is nothing to meet: counted as lost") {
        CHECK(caster.trace({0, 0, -50}, {0, 1, 0}, -1).kind == Hit::Kind::lost);
        CHECK(caster.lost() == 1);
        CHECK(caster.traced() == 1);
    }
    SECTION("a ray into the corner of floor and wall meets the wall it leaves from nowhere else") {
        // From the first wall element above the floor, aimed down: the floor is a concave
        // neighbour.
        const int floor = caster.trace({-19.5, 0, -50}, {0, 0, -1}, -1).element;
        const int wall = s.previous[floor];
        const Hit hit = caster.trace({-20, 0, -100 + 1e-13}, Vec3(1, 0, -1).normalized(), wall);
        REQUIRE(hit.kind == Hit::Kind::surface);
        CHECK(hit.element == floor);
        CHECK(hit.distance < 1e-9);
    }
    SECTION("a ray from a convex corner does not meet the neighbour") {
        const int lip = caster.trace({-20.5, 0, 1}, {0, 0, -1}, -1).element;
        const Hit hit = caster.trace({-20, 0, 0}, Vec3(1, 0, 1e-9).normalized(), lip);
        CHECK(hit.kind == Hit::Kind::open); // nothing stands above the top
        const Hit wall = caster.trace({-20, 0, 0}, Vec3(1, 0, -1e-3).normalized(), s.next[lip]);
        REQUIRE(wall.kind == Hit::Kind::surface);
        CHECK(wall.distance == near(40 * std::sqrt(1 + 1e-6)));
    }
}

TEST_CASE("no extruded ray is lost in a million", "[rays]") {
    // Oracle: a closed surface under an open sky loses nothing.
    // Source: derived here.
    // Tolerance: none lost. A surface with a segment taken out must lose rays.
    std::uint64_t traced = 0;
    for (const Sides sides : {Sides::mirror, Sides::periodic})
        for (std::uint64_t seed = 11; seed <= 15; ++seed) {
            const Domain domain = period(Symmetry::extruded, sides, 100, 0.7);
            const Surface s = wavy(domain, seed, 2 + static_cast<int>(seed) % 4);
            const RayCaster caster(domain, s, 2.0);
            for (int ray = 0; ray < 110000; ++ray) {
                const int e = ray % static_cast<int>(s.size());
                const double u = uniform(seed, 3 * ray);
                // A fifth of the rays start exactly at a vertex or the centre.
                const double where = ray % 10 == 0 ? std::floor(2 * u) : ray % 10 == 1 ? 0.5 : u;
                const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
                const Vec3 d = cosine_direction(s.normal[e], uniform(seed, 3 * ray + 1),
                                                uniform(seed, 3 * ray + 2));
                caster.trace(a + (b - a) * where, d, e);
            }
            traced += caster.traced();
            CHECK(caster.lost() == 0);
        }
    CHECK(traced > 1000000);

    const Domain domain = period(Symmetry::extruded, Sides::mirror, 100, 1.0);
    Surface holed = trench(domain, 40, 40, 1.0);
    for (auto* list : {&holed.normal, &holed.centre})
        list->erase(list->begin() + 90);
    holed.corners.erase(holed.corners.begin() + 90);
    for (auto* list : {&holed.next, &holed.previous})
        list->pop_back();
    holed.next.back() = -1;
    const RayCaster caster(domain, holed, 2.0);
    for (int ray = 0; ray < 20000; ++ray)
        caster.trace({0, 0, -5},
                     cosine_direction({0, 0, -1}, uniform(1, 2 * ray), uniform(1, 2 * ray + 1)),
                     -1);
    CHECK(caster.lost() > 10);
}

TEST_CASE("many extruded rays at once hit what they hit one by one", "[rays]") {
    // Oracle: RayCaster::trace for a single ray.
    // Source: the same operations in the same order (IEEE 754).
    // Tolerance: none. Rays turned by 1e-12 must end elsewhere.
    const auto differ = [](const Hit& a, const Hit& b) {
        return a.kind != b.kind || a.element != b.element || a.distance != b.distance ||
               a.point != b.point || a.direction != b.direction;
    };
    std::size_t surface = 0, open = 0, turned = 0;
    for (std::uint64_t seed = 1; seed <= 9; ++seed) {
        const Sides sides = seed % 2 ? Sides::mirror : Sides::periodic;
        const Domain domain = period(Symmetry::extruded, sides, 60, 1.0);
        const Surface s = seed % 3 == 0   ? slitted(domain, seed)
                          : seed % 3 == 1 ? wavy(domain, seed, 3)
                                          : trench(domain, 30, 90, 1.0);
        const RayCaster one(domain, s, 2.0), many(domain, s, 2.0);
        std::vector<RayStart> rays;
        for (int n = 0; n < 20011; ++n) {
            const int e = static_cast<int>(uniform(seed, 4 * n) * s.size());
            const double u = uniform(seed, 4 * n + 1), at = n % 10 ? u : std::floor(2 * u);
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const Vec3 d = n % 97 == 0 ? Vec3(0, n % 2 ? 1 : -1, 0)
                                       : cosine_direction(s.normal[e], uniform(seed, 4 * n + 2),
                                                          uniform(seed, 4 * n + 3));
            if (n % 11 == 0)
                rays.push_back({Vec3(20 * u, 3, 1.5), d, -1});
            else
                rays.push_back({a + (b - a) * at, d, e});
        }
        std::vector<Hit> hits(rays.size());
        many.trace(rays.data(), rays.size(), hits.data());
        std::size_t different = 0;
        for (std::size_t n = 0; n < rays.size(); ++n) {
            const RayStart& ray = rays[n];
            different += differ(hits[n], one.trace(ray.origin, ray.direction, ray.from_element));
            surface += hits[n].kind == Hit::Kind::surface;
            open += hits[n].kind == Hit::Kind::open;
            const Vec3 off = (ray.direction + Vec3(1e-12, 0, 2e-12)).normalized();
            turned += differ(hits[n], one.trace(ray.origin, off, ray.from_element));
        }
        CHECK(different == 0);
        CHECK(many.traced() == rays.size());
        CHECK(2 * many.traced() == one.traced());
    }
    CHECK(surface > 90000);
    CHECK(open > 10000);
    CHECK(turned > 120000);
}
