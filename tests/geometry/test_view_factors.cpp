// SPDX-License-Identifier: Apache-2.0
#include "geometry/ray_caster.hpp"
#include "tests/support/pulls.hpp"
#include "tests/support/random_rays.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>
#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>
#include <tbb/task_arena.h>

#include <cmath>
#include <cstring>
#include <vector>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

/// Escaped rays per bin; bin[e] is the bin of element e, or -1. Rays start uniformly over each bin.
struct Escapes {
    std::vector<double> count;
    std::vector<double> faulty; ///< the same with every 50th escaped ray forgotten
};

Vec3 random_point(const Surface& s, int e, double u, double v) {
    const auto& c = s.corners[e];
    const Vec3 a = s.vertices[c[0]], b = s.vertices[c[1]];
    if (c[2] < 0) return a + u * (b - a);
    // Uniform over a symmetric trapezoid a b c d with parallel sides ab and dc.
    const Vec3 p = s.vertices[c[2]], q = s.vertices[c[3]];
    const double wide = (b - a).length(), narrow = (p - q).length();
    const double change = narrow / wide - 1;
    const double w =
        std::fabs(change) < 1e-9 ? v : (std::sqrt(1 + v * change * (2 + change)) - 1) / change;
    return (a + w * (q - a)) * (1 - u) + (b + w * (p - b)) * u;
}

Escapes count_escapes(const RayCaster& caster, const Surface& s,
                      const std::vector<std::vector<int>>& bins, int rays, std::uint64_t seed) {
    Escapes r;
    for (std::size_t b = 0; b < bins.size(); ++b) {
        int open = 0;
        for (int n = 0; n < rays; ++n) {
            const auto random = [&](int k) { return uniform(seed + b, 5ull * n + k); };
            const int e = bins[b][static_cast<int>(random(0) * bins[b].size())];
            const Vec3 d = cosine_direction(s.normal[e], random(3), random(4));
            open += caster.trace(random_point(s, e, random(1), random(2)), d, e).kind ==
                    Hit::Kind::open;
        }
        r.count.push_back(open);
        r.faulty.push_back(open - open / 50);
    }
    return r;
}

} // namespace

TEST_CASE("view factors of a trench", "[rays]") {
    // Oracle: share of the mouth seen from floor and walls,
    //   floor 1/2 [(w/2-x)/sqrt((w/2-x)^2+L^2) + (w/2+x)/sqrt((w/2+x)^2+L^2)],
    //   wall 1/2 [1 - z/sqrt(z^2+w^2)], both averaged over each element in closed form.
    // Source: derived here (in-plane marginal of the cosine law).
    // Tolerance: chi^2, largest and mean pull (pulls.hpp), 20,000 rays in each of 100 bins, seed
    // fixed in advance; every 50th escape forgotten must fail.
    const double w = 40, depth = 80;
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        Domain domain;
        domain.sides = sides;
        domain.cells_x = 60;
        const Surface s = trench(domain, w, depth, 2.0);
        const RayCaster caster(domain, s, 2.0);
        std::vector<std::vector<int>> bins;
        std::vector<double> p;
        for (int e = 0; e < static_cast<int>(s.size()); ++e) {
            const Vec3 a = s.vertices[s.corners[e][0]], b = s.vertices[s.corners[e][1]];
            if (s.centre[e].z > -1e-9) continue;
            bins.push_back({e});
            if (s.normal[e].z > 0.5) {
                const auto up = [&](double x) {
                    return std::hypot(0.5 * w + x, depth) - std::hypot(0.5 * w - x, depth);
                };
                p.push_back(0.5 * (up(b.x) - up(a.x)) / (b.x - a.x));
            } else {
                const auto up = [&](double z) { return z - std::hypot(z, w); };
                p.push_back(0.5 * (up(-b.z) - up(-a.z)) / (a.z - b.z));
            }
        }
        REQUIRE(bins.size() == 100);
        const Escapes r = count_escapes(caster, s, bins, 20000, 4242);
        const Pulls pulls = binomial_pulls(r.count, p, 20000);
        INFO(pulls.chi2_per_bin << " " << pulls.largest << " " << pulls.mean);
        CHECK(pulls.pass());
        CHECK_FALSE(binomial_pulls(r.faulty, p, 20000).pass());
        CHECK(caster.lost() == 0);
    }
}

TEST_CASE("view factors of a round hole", "[rays]") {
    // Oracle: share of the mouth seen from rings of floor and wall. Coaxial disks of radii a, b at
    // distance c: F_ab = 1/2 [S - sqrt(S^2 - 4 (b/a)^2)], S = 1 + (c^2 + b^2)/a^2, rings by
    // difference; wall (X^2 + 1/2)/sqrt(X^2 + 1) - X, X = z/2R, averaged in closed form.
    // Source: derived here (standard diffuse view factors).
    // Tolerance: as for the trench; 16,000 rays in each of 50 bins. 384 facets around stand for the
    // circle (0.005 % of the area, far below the statistics).
    const double radius = 20, depth = 50;
    const int around = 384, wall_rings = 30, floor_rings = 20;
    Domain domain;
    domain.symmetry = Symmetry::full;
    domain.cells_x = domain.cells_y = 60;
    std::vector<std::array<double, 2>> profile;
    for (int k = 0; k <= wall_rings; ++k)
        profile.push_back({radius, -depth * k / wall_rings});
    for (int k = 1; k <= floor_rings; ++k)
        profile.push_back({radius * (floor_rings - k) / floor_rings, -depth});
    const Surface s = revolved_hole(domain, profile, around);
    const auto disk = [&](double a) { // disk a on the floor to the mouth, times its area over pi
        const double size = 1 + (depth * depth + radius * radius) / (a * a);
        return a == 0
                   ? 0.0
                   : 0.5 * a * a * (size - std::sqrt(size * size - 4 * radius * radius / (a * a)));
    };
    const auto wall = [](double x) { return 0.5 * x * std::sqrt(x * x + 1) - 0.5 * x * x; };
    std::vector<std::vector<int>> bins;
    std::vector<double> p;
    for (int ring = 0; ring + 1 < wall_rings + floor_rings; ++ring) {
        bins.emplace_back();
        for (int i = 0; i < around; ++i)
            bins.back().push_back((ring + 1) * around + i);
        const auto [ra, za] = profile[ring];
        const auto [rb, zb] = profile[ring + 1];
        p.push_back(ring < wall_rings ? (wall(-zb / 2 / radius) - wall(-za / 2 / radius)) /
                                            ((za - zb) / 2 / radius)
                                      : (disk(ra) - disk(rb)) / (ra * ra - rb * rb));
    }
    const RayCaster caster(domain, s, 2.0);
    const Escapes r = count_escapes(caster, s, bins, 16000, 777);
    const Pulls pulls = binomial_pulls(r.count, p, 16000);
    INFO(pulls.chi2_per_bin << " " << pulls.largest << " " << pulls.mean);
    CHECK(pulls.pass());
    CHECK_FALSE(binomial_pulls(r.faulty, p, 16000).pass());
    CHECK(caster.lost() == 0);
}

TEST_CASE("view factors under an overhanging mask", "[rays]") {
    // Oracle: opening a = 1, mask t = 0.5, cavity floor d = 2 below it: F = 1/2 (sin R - sin L)
    // over the interval the mask leaves free: 0.196116 at x = 0, 0.185695 at 0.5, 0.156506 at 0.8;
    // the underside of the mask sees nothing. Source: derived here. Tolerance: each of 6 points
    // within 4 standard errors of 400,000 rays (0.3 %), the sum of pulls within 4 sqrt(6); every
    // 50th escape forgotten must fail.
    const double a = 50, t = 25, d = 100, half = 80;
    Domain domain;
    domain.cells_x = 200;
    const Surface s = polyline(domain,
                               {{-100, 0, 0},
                                {-a / 2, 0, 0},
                                {-a / 2, 0, -t},
                                {-half, 0, -t},
                                {-half, 0, -t - d},
                                {half, 0, -t - d},
                                {half, 0, -t},
                                {a / 2, 0, -t},
                                {a / 2, 0, 0},
                                {100, 0, 0}},
                               1.0);
    const RayCaster caster(domain, s, 2.0);
    const int rays = 400000;
    double sum = 0, faulty = 0;
    for (int point = 0; point < 6; ++point) {
        const double where[3] = {0, 0.5, 0.8}, wanted[3] = {0.196116, 0.185695, 0.156506};
        const double p = wanted[point % 3], x = (point < 3 ? a : -a) * where[point % 3];
        int open = 0;
        for (int n = 0; n < rays; ++n) {
            const Vec3 way = cosine_direction({0, 0, 1}, uniform(90 + point, 2 * n),
                                              uniform(90 + point, 2 * n + 1));
            open += caster.trace({x, 0, -t - d + 1e-9}, way, -1).kind == Hit::Kind::open;
        }
        const double error = std::sqrt(rays * p * (1 - p));
        CHECK(std::fabs(open - rays * p) < 4 * error);
        sum += (open - rays * p) / error;
        faulty += (open - open / 50 - rays * p) / error;
    }
    CHECK(std::fabs(sum) < 4 * std::sqrt(6.0));
    CHECK(std::fabs(faulty) > 4 * std::sqrt(6.0));
    int under = 0;
    for (int n = 0; n < 20000; ++n)
        under +=
            caster
                .trace({-60, 0, -t},
                       cosine_direction({0, 0, -1}, uniform(5, 2 * n), uniform(5, 2 * n + 1)), -1)
                .kind == Hit::Kind::open;
    CHECK(under == 0);
}

TEST_CASE("rays give the same bits from any thread", "[rays]") {
    // Oracle: the same rays one after another.
    // Source: derived here.
    // Tolerance: none, bit for bit.
    for (const Symmetry symmetry : {Symmetry::extruded, Symmetry::full}) {
        Domain domain;
        domain.symmetry = symmetry;
        domain.cells_x = domain.cells_y = 60;
        const Surface s = symmetry == Symmetry::full
                              ? revolved_hole(domain, {{20, 0}, {18, -40}, {0, -40}}, 48)
                              : trench(domain, 30, 60, 1.0);
        const auto run = [&](int threads) {
            const RayCaster caster(domain, s, 2.0);
            std::vector<Hit> hits(20000);
            tbb::task_arena(threads).execute([&] {
                tbb::parallel_for(tbb::blocked_range<int>(0, 20000, 100), [&](const auto& range) {
                    for (int n = range.begin(); n < range.end(); ++n) {
                        const int e = n % static_cast<int>(s.size());
                        const Vec3 d =
                            cosine_direction(s.normal[e], uniform(3, 2 * n), uniform(3, 2 * n + 1));
                        hits[n] = caster.trace(s.centre[e], d, e);
                    }
                });
            });
            CHECK(caster.traced() == 20000);
            return hits;
        };
        const std::vector<Hit> one = run(1), two = run(2), four = run(4);
        int unlike = 0;
        for (std::size_t n = 0; n < one.size(); ++n)
            for (const Hit* other : {&two[n], &four[n]}) {
                const bool same = one[n].kind == other->kind && one[n].element == other->element &&
                                  std::memcmp(&one[n].distance, &other->distance, 8) == 0 &&
                                  one[n].point == other->point &&
                                  one[n].direction == other->direction;
                unlike += !same;
            }
        CHECK(unlike == 0);
    }
}
