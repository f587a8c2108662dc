// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"
#include "tests/geometry/etch_loop.hpp"

#include <catch2/catch.hpp>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

Loop full_loop(double rate) {
    Loop loop;
    loop.angles = {0, pi};
    loop.law = [rate](const Surface&, int, int, double) { return rate; };
    return loop;
}

double sphere_error(int cells, double rate) {
    const double h = 24.0 / cells;
    Front front(
        make_domain(Symmetry::full, Sides::periodic, h, cells, cells),
        [](const Vec3& p) { return p.length() - 8; }, -8, 8);
    etch(front, full_loop(rate), 2);
    double sum = 0;
    const Surface s = extract_surface(front);
    for (const Vec3& v : s.vertices)
        sum += std::fabs(v.length() - (8 - 2 * rate));
    return sum / s.vertices.size();
}

double volume(const Surface& s) {
    double sum = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        sum += s.centre[e].z * s.normal[e].z * s.area[e];
    return sum;
}

/// Relative error of the volume of a cube of side 20.6 after its faces moved by `offset`.
double cube_error(double offset) {
    const double half = 10.3;
    Front front(
        make_domain(Symmetry::full, Sides::periodic, 1, 36, 36),
        [=](const Vec3& p) {
            const Vec3 q(std::fabs(p.x) - half, std::fabs(p.y) - half, std::fabs(p.z) - half);
            const Vec3 out(std::max(q.x, 0.0), std::max(q.y, 0.0), std::max(q.z, 0.0));
            return out.length() + std::min(0.0, std::max(q.x, std::max(q.y, q.z)));
        },
        -half, half);
    etch(front, full_loop(offset > 0 ? -1 : 1), std::fabs(offset));
    const double s = 2 * half, t = offset;
    const double exact =
        t < 0 ? std::pow(s + 2 * t, 3)
              : s * s * s + 6 * s * s * t + 3 * pi * s * t * t + 4 * pi * t * t * t / 3;
    return volume(extract_surface(front)) / exact - 1;
}

} // namespace

TEST_CASE("planes of a full domain move exactly", "[advance][full]") {
    // Oracle: depth = rate * time. Source: derived here. Tolerance: round-off.
    for (const Sides sides : {Sides::mirror, Sides::periodic}) {
        Front front(
            make_domain(Symmetry::full, sides, 0.5, 6, 5), [](const Vec3& p) { return p.z; }, 0, 0);
        etch(front, full_loop(0.7), 10);
        CHECK(worst_vertex(extract_surface(front), [](const Vec3& p) { return p.z + 7; }) < 1e-12);
    }
}

TEST_CASE("spheres keep second order", "[advance][full]") {
    // Oracle: the radius changes by rate * time. Source: derived here. Tolerance: order >= 1.8 from
    // 12 cells of radius on (at 8, where errors of both signs nearly cancel, 1.79); 0.01 cell at 8.
    for (const double rate : {1.0, -0.5}) {
        const double coarse = sphere_error(36, rate), fine = sphere_error(72, rate);
        CAPTURE(rate, coarse, fine, std::log2(coarse / fine));
        CHECK(std::log2(coarse / fine) >= 1.8);
        CHECK(sphere_error(24, rate) < 0.01);
    }
}

TEST_CASE("cubes move inwards and outwards", "[advance][full]") {
    // Oracle: (s - 2t)^3 inwards; s^3 + 6 s^2 t + 3 pi s t^2 + 4 pi t^3 / 3 outwards.
    // Source: derived here (offsets of convex bodies). Tolerance: 0.1 % of the volume inwards; 1 %
    // outwards, which is 0.05 cell over the surface (the fans start at edges that no cell
    // resolves).
    const double inwards = cube_error(-3), outwards = cube_error(3);
    CAPTURE(inwards, outwards);
    CHECK(std::fabs(inwards) < 0.001);
    CHECK(std::fabs(outwards) < 0.01);
}
