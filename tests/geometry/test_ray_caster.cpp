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
            if (e == from && image == 0)
                continue;
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            const long double shift = image * static_cast<long double>(domain.width_x());
            const long double ax = shift + (turn ? -a.x : a.x) - o.x, az = a.z - o.z;
            const long double bx = shift + (turn ? -b.x : b.x) - o.x, bz = b.z - o.z;
            const long double side_a = d.x * az - d.z * ax, side_b = d.x * bz - d.z * bx;
            if ((side_a < 0) == (side_b < 0))
                continue;
            const long double plane = static_cast<long double>(d.x) * d.x + d.z * d.z;
            const long double ta = (d.x * ax + d.z * az) / plane,
                              tb = (d.x * bx + d.z * bz) / plane;
            const long double t = ta + (tb - ta) * side_a / (side_a - side_b);
            if (t > 1e-9 && t < best.t)
                best = {static_cast<double>(t), e};
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
                if (open != (hit.kind == Hit::Kind::open))
                    ++wrong;
                if (open || hit.kind != Hit::Kind::surface)
                    continue;
                ++hits;
                if (std::fabs(hit.distance - wanted.t) > 1e-7)
                    ++wrong;
                if (hit.element != wanted.element && std::abs(hit.element - wanted.element) != 1)
                    ++wrong;
                if (std::fabs(hit.direction.length() - 1) > 1e-12)
                    ++wrong;
                if (hit.direction.dot(s.normal[hit.element]) > 0)
                    ++wrong;
            }
            CHECK(wrong == 0);
            CHECK(hits > 500);
            CHECK(caster.lost() == 0);
        }
}
