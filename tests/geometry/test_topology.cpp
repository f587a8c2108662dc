// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"
#include "geometry/isolated_parts.hpp"
#include "tests/support/make_band.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::geometry;
using namespace rille::tests;

namespace {

const IsolatedPart* find(const std::vector<IsolatedPart>& parts, IsolatedPart::Kind kind) {
    for (const auto& p : parts)
        if (p.kind == kind) return &p;
    return nullptr;
}

} // namespace

TEST_CASE("a void and a detached piece are found", "[topology]") {
    // Oracle: volumes of balls and discs. Source: derived here. Tolerance: 2 % of the volume
    // and 0.1 cell of the centre at radii of 9 and 8 cells. Full surfaces are inscribed in round
    // shapes: their volume falls short by about 1.1 h^2 / R^2 (3 % at a radius of 6 cells).
    for (const Symmetry symmetry : {Symmetry::extruded, Symmetry::full})
        for (const Sides sides : {Sides::mirror, Sides::periodic})
            for (const double x : {3.3, 23.0}) { // inside; over a periodic side
                if (sides == Sides::mirror && x > 10) continue;
                Domain d;
                d.symmetry = symmetry;
                d.sides = sides;
                d.cells_x = 48;
                d.cells_y = symmetry == Symmetry::full ? 48 : 1;
                const Vec3 hole(x, symmetry == Symmetry::full ? -2.2 : 0, -12.3), drop(-6, 0, 12.1);
                const auto away = [&](Vec3 p, const Vec3& c) {
                    Vec3 v = p - c;
                    if (sides == Sides::periodic) v.x -= 48 * std::round(v.x / 48);
                    return v.length();
                };
                const auto shape = [&](const Vec3& p) {
                    return std::min(std::max(p.z, 9 - away(p, hole)), away(p, drop) - 8);
                };
                const Surface s = extract_surface(make_band(d, shape, -22, 21));
                const auto parts = find_isolated_parts(d, s);
                REQUIRE(parts.size() == 2);
                const auto* gas = find(parts, IsolatedPart::Kind::closed_void);
                const auto* solid = find(parts, IsolatedPart::Kind::detached_solid);
                REQUIRE(gas);
                REQUIRE(solid);
                const bool full = symmetry == Symmetry::full;
                CHECK(gas->volume == Approx(full ? 4 * M_PI / 3 * 729 : M_PI * 81).epsilon(0.02));
                CHECK(solid->volume == Approx(full ? 4 * M_PI / 3 * 512 : M_PI * 64).epsilon(0.02));
                CHECK(away(gas->centre, hole) < 0.1);
                CHECK(away(solid->centre, drop) < 0.1);
                CHECK(gas->chain > 0);
                CHECK(gas->chain != solid->chain);
            }
}

TEST_CASE("layers across the whole period count as parts", "[topology]") {
    // Oracle: thickness times width. Source: derived here. Tolerance: round-off.
    Domain d;
    d.cells_x = 20;
    const auto shape = [](const Vec3& p) { // solid below -5 and in [2, 9]
        return std::min(p.z + 5, std::max(2 - p.z, p.z - 9));
    };
    const Surface s = extract_surface(make_band(d, shape, -6, 10));
    const auto parts = find_isolated_parts(d, s);
    REQUIRE(parts.size() == 2);
    CHECK(find(parts, IsolatedPart::Kind::detached_solid)->volume == Approx(140));
    CHECK(find(parts, IsolatedPart::Kind::closed_void)->volume == Approx(140));
    CHECK(find(parts, IsolatedPart::Kind::closed_void)->centre.z == Approx(-1.5));
    CHECK(find(parts, IsolatedPart::Kind::detached_solid)->centre.z == Approx(5.5));
}

TEST_CASE("an open surface has no isolated parts", "[topology]") {
    Domain d;
    d.cells_x = 20;
    const Surface s = extract_surface(make_band(
        d, [](const Vec3& p) { return p.z; }, -1, 1));
    CHECK(find_isolated_parts(d, s).empty());
}
